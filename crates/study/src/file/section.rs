//! Reading one table of the study file: typed values with their places, and no key left unread.

use std::cell::RefCell;
use std::ops::Range;

use toml_edit::{Item, Key, TableLike, Value};

use super::source::{Located, Origin, Source};
use crate::error::{Location, Problem};
use crate::fault::Fault;
use crate::nearest::Nearest;

/// The text being read and what was found wrong so far.
pub(crate) struct Reader<'a> {
    pub(crate) source: &'a Source,
    problems: RefCell<Vec<Problem>>,
    /// Every key that a section asked for: what the template has to explain.
    #[cfg(test)]
    pub(crate) asked: RefCell<std::collections::BTreeSet<(&'static str, String)>>,
}

impl<'a> Reader<'a> {
    pub(crate) fn new(source: &'a Source) -> Self {
        Self {
            source,
            problems: RefCell::default(),
            #[cfg(test)]
            asked: RefCell::default(),
        }
    }

    /// Records a broken rule at a range of bytes; without one, at the file as a whole.
    pub(crate) fn fault(&self, span: Option<Range<usize>>, fault: Fault) {
        let name = self.source.name().to_owned();
        let location = match span {
            _ if self.source.is_command_line() => Location::Option { option: name },
            Some(span) => {
                let place = self.source.place(span);
                Location::File { file: name, line: place.line, column: place.column }
            }
            None => Location::WholeFile { file: name },
        };
        self.problems.borrow_mut().push(Problem { location, fault });
    }

    pub(crate) fn into_problems(self) -> Vec<Problem> {
        self.problems.into_inner()
    }

    /// What kind of value this is, with what was typed.
    pub(crate) fn found(&self, item: &Item) -> String {
        let typed = self.source.typed(item.span());
        match item {
            Item::Value(Value::String(_)) => format!("the text {typed}"),
            Item::Value(Value::Integer(_) | Value::Float(_)) => format!("the number {typed}"),
            Item::Value(Value::Boolean(_)) => typed,
            Item::Value(Value::Datetime(_)) => format!("the date {typed}"),
            Item::Value(Value::Array(_)) => format!("the list {typed}"),
            Item::Value(Value::InlineTable(_)) => format!("the table {typed}"),
            Item::Table(_) => "a table".to_owned(),
            Item::ArrayOfTables(_) => "several tables".to_owned(),
            Item::None => "nothing".to_owned(),
        }
    }
}

/// One table of the file. Whatever key is asked for is known; what was never asked for is an error at [`Section::finish`].
pub(crate) struct Section<'a> {
    pub(crate) reader: &'a Reader<'a>,
    table: &'a dyn TableLike,
    span: Option<Range<usize>>,
    /// What kind of section it is, for the test that the template explains every key.
    #[cfg_attr(not(test), allow(dead_code, reason = "only tests ask"))]
    kind: &'static str,
    /// How errors speak of it, as `[background]`.
    label: String,
    known: RefCell<Vec<String>>,
    missing: RefCell<Vec<(String, Fault)>>,
}

impl<'a> Section<'a> {
    pub(crate) fn new(
        reader: &'a Reader<'a>,
        table: &'a dyn TableLike,
        span: Option<Range<usize>>,
        kind: &'static str,
        label: impl Into<String>,
    ) -> Self {
        Self {
            reader,
            table,
            span,
            kind,
            label: label.into(),
            known: RefCell::default(),
            missing: RefCell::default(),
        }
    }

    pub(crate) fn span(&self) -> Option<Range<usize>> {
        self.span.clone()
    }

    /// Makes a key known and finds it.
    pub(crate) fn find(&self, key: &str) -> Option<(&'a Key, &'a Item)> {
        #[cfg(test)]
        self.reader.asked.borrow_mut().insert((self.kind, key.to_owned()));
        let mut known = self.known.borrow_mut();
        if !known.iter().any(|name| name == key) {
            known.push(key.to_owned());
        }
        self.table.get_key_value(key)
    }

    /// The keys that stand in the table, in its order.
    pub(crate) fn keys(&self) -> Vec<(&'a Key, &'a Item)> {
        self.table.iter().filter_map(|(name, _)| self.table.get_key_value(name)).collect()
    }

    /// A key that should be there. Said at [`Section::finish`], unless an unknown key turns out to be a slip of it.
    pub(crate) fn missing(&self, key: &str, example: &str) {
        let fault = Fault::MissingKey {
            section: self.label.clone(),
            key: key.to_owned(),
            example: example.to_owned(),
        };
        self.missing.borrow_mut().push((key.to_owned(), fault));
    }

    pub(crate) fn wrong_type(&self, key: &str, expected: &'static str, item: &Item, example: &'static str) {
        let fault =
            Fault::WrongType { key: key.to_owned(), expected, found: self.reader.found(item), example };
        self.reader.fault(span_of(self.table, key, item), fault);
    }

    /// Records a broken rule at the value of a key.
    pub(crate) fn fault_at(&self, key: &str, fault: Fault) {
        let span = self.table.get_key_value(key).and_then(|(key, item)| item.span().or_else(|| key.span()));
        self.reader.fault(span.or_else(|| self.span.clone()), fault);
    }

    /// Records a broken rule at a key itself.
    pub(crate) fn fault_at_key(&self, key: &str, fault: Fault) {
        let span = self.table.get_key_value(key).and_then(|(key, _)| key.span());
        self.reader.fault(span.or_else(|| self.span.clone()), fault);
    }

    pub(crate) fn text(&self, key: &str, example: &'static str) -> Option<Located<String>> {
        let (_, item) = self.find(key)?;
        let Some(text) = item.as_str() else {
            self.wrong_type(key, "a text in quotes", item, example);
            return None;
        };
        if text.trim().is_empty() {
            let fault = Fault::OutOfRange {
                name: key.to_owned(),
                rule: "a text with at least one letter",
                value: "empty".to_owned(),
                way_out: "fill it in or remove the line",
            };
            self.fault_at(key, fault);
            return None;
        }
        Some(Located { value: text.to_owned(), origin: self.origin(key, item) })
    }

    /// A text that must be there; `example` is the value, with its quotes.
    pub(crate) fn required_text(&self, key: &str, example: &'static str) -> Option<Located<String>> {
        if self.find(key).is_none() {
            self.missing(key, &format!("{key} = {example}"));
            return None;
        }
        self.text(key, example)
    }

    /// One word out of several.
    pub(crate) fn choice<T: Copy>(
        &self,
        key: &str,
        what: &'static str,
        choices: &[(&'static str, T)],
        example: &'static str,
    ) -> Option<Located<T>> {
        let text = self.text(key, example)?;
        if let Some((_, choice)) = choices.iter().find(|(name, _)| *name == text.value) {
            return Some(text.map(|_| *choice));
        }
        let nearest = Nearest::find(&text.value, choices.iter().map(|(name, _)| *name));
        self.fault_at(key, Fault::UnknownChoice { what, value: text.value, nearest });
        None
    }

    pub(crate) fn flag(&self, key: &str, default: bool) -> Option<Located<bool>> {
        let Some((_, item)) = self.find(key) else {
            return Some(Located::default_of(default));
        };
        let Some(value) = item.as_bool() else {
            self.wrong_type(key, "true or false", item, if default { "true" } else { "false" });
            return None;
        };
        Some(Located { value, origin: self.origin(key, item) })
    }

    /// A finite number.
    pub(crate) fn number(&self, key: &str, example: &'static str) -> Option<Located<f64>> {
        let (_, item) = self.find(key)?;
        let Some(value) = number_of(item) else {
            self.wrong_type(key, "a number", item, example);
            return None;
        };
        if !value.is_finite() {
            self.fault_at(key, Fault::NotFinite { name: key.to_owned(), value });
            return None;
        }
        Some(Located { value, origin: self.origin(key, item) })
    }

    /// A whole number of a range, both ends included.
    pub(crate) fn count(
        &self,
        key: &str,
        (low, high): (u64, u64),
        rule: &'static str,
        example: &'static str,
    ) -> Option<Located<u64>> {
        let (_, item) = self.find(key)?;
        let Some(value) = item.as_integer() else {
            self.wrong_type(key, "a whole number", item, example);
            return None;
        };
        match u64::try_from(value) {
            Ok(count) if (low..=high).contains(&count) => {
                Some(Located { value: count, origin: self.origin(key, item) })
            }
            _ => {
                let (name, value) = (key.to_owned(), value.to_string());
                self.fault_at(key, Fault::OutOfRange { name, rule, value, way_out: "choose another number" });
                None
            }
        }
    }

    /// A table inside this one.
    pub(crate) fn table(
        &self,
        key: &str,
        kind: &'static str,
        label: impl Into<String>,
        example: &'static str,
    ) -> Option<Section<'a>> {
        let (name, item) = self.find(key)?;
        match item.as_table_like() {
            Some(table) => {
                Some(Section::new(self.reader, table, item.span().or_else(|| name.span()), kind, label))
            }
            None => {
                self.wrong_type(key, "a table", item, example);
                None
            }
        }
    }

    /// The tables of an array of tables, written either way; one table alone counts as an array of one.
    pub(crate) fn tables(
        &self,
        key: &str,
        kind: &'static str,
        label: &str,
        example: &'static str,
    ) -> Vec<Section<'a>> {
        let Some((name, item)) = self.find(key) else {
            return Vec::new();
        };
        let open = |table: &'a dyn TableLike, span: Option<Range<usize>>| {
            Section::new(self.reader, table, span.or_else(|| name.span()), kind, label)
        };
        let sections: Option<Vec<Section<'a>>> = match item {
            Item::ArrayOfTables(tables) => {
                Some(tables.iter().map(|table| open(table, table.span())).collect())
            }
            Item::Value(Value::Array(array)) => array
                .iter()
                .map(|value| value.as_inline_table().map(|table| open(table, table.span())))
                .collect(),
            _ => item.as_table_like().map(|table| vec![open(table, item.span())]),
        };
        sections.unwrap_or_else(|| {
            self.wrong_type(key, "a list of tables", item, example);
            Vec::new()
        })
    }

    /// Where the value of a key stands.
    pub(crate) fn origin(&self, key: &str, item: &Item) -> Origin {
        self.reader.source.origin(span_of(self.table, key, item))
    }

    /// Complains of every key that nobody asked for.
    pub(crate) fn finish(self) {
        self.finish_knowing(&[]);
    }

    /// As [`Section::finish`], with keys that are dealt with elsewhere.
    pub(crate) fn finish_knowing(self, elsewhere: &[&str]) {
        let known = self.known.borrow();
        let mut missing = self.missing.take();
        for (key, _) in self.keys() {
            let name = key.get();
            if known.iter().any(|each| each == name) || elsewhere.contains(&name) {
                continue;
            }
            let absent = known.iter().filter(|known| self.table.get(known).is_none());
            let nearest = match Nearest::find(name, absent) {
                slip if slip.is_close() => slip,
                _ => Nearest::find(name, known.iter()),
            };
            missing.retain(|(key, _)| !nearest.is_close() || nearest.name() != Some(key));
            let fault = Fault::UnknownKey { key: name.to_owned(), section: self.label.clone(), nearest };
            self.reader.fault(key.span().or_else(|| self.span.clone()), fault);
        }
        for (_, fault) in missing {
            self.reader.fault(self.span.clone(), fault);
        }
    }
}

/// The bytes of a value, or of its key where the value has none (a table opened by dotted keys).
fn span_of(table: &dyn TableLike, key: &str, item: &Item) -> Option<Range<usize>> {
    item.span().or_else(|| table.get_key_value(key).and_then(|(key, _)| key.span()))
}

/// A number, whole or not.
pub(crate) fn number_of(item: &Item) -> Option<f64> {
    item.as_float().or_else(|| item.as_integer().map(|whole| whole as f64))
}

/// The numbers of a list; none where it holds anything else.
pub(crate) fn numbers_of(item: &Item) -> Option<Vec<f64>> {
    let array = item.as_array()?;
    array
        .iter()
        .map(|value| value.as_float().or_else(|| value.as_integer().map(|whole| whole as f64)))
        .collect()
}
