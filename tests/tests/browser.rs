//! The page in a real browser: nothing goes wrong, nothing is fetched, and everything can be done that it offers.
//!
//! Needs Chromium (Debian's package `chromium`); without it, and outside of continuous integration, the test says so and
//! passes. With `ODDWELL_AXE` set to the path of axe-core's `axe.min.js` (npm package `axe-core`), accessibility is
//! checked too.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stderr,
    reason = "a test stops at the first surprise"
)]

use oddwell_report::{PageInput, page};
use oddwell_study::review::{Review, review};
use oddwell_study::{Control, FitOptions, Study, fit};
use oddwell_tests::browser::open;
use serde_json::Value;
use std::path::{Path, PathBuf};

fn run(study: &Study, hypothesis: &str, out: &Path) -> Review {
    let options = FitOptions {
        out: out.to_owned(),
        existing: oddwell_study::Existing::Refuse,
        seed: None,
        maximum_evaluations: None,
        command: vec!["oddwell".to_owned(), "fit".to_owned()],
        threads: 2,
    };
    fit(study, study.hypothesis(Some(hypothesis)).unwrap(), &options, &mut |_, _| Control::Continue).unwrap();
    review(out).unwrap()
}

fn demo_page() -> String {
    let folder = tempfile::tempdir().unwrap();
    let study =
        Study::read(Path::new(env!("CARGO_MANIFEST_DIR")).join("../data-demo/study.toml"), &[]).unwrap();
    let runs: Vec<Review> =
        ["constant", "per-bin"].iter().map(|name| run(&study, name, &folder.path().join(name))).collect();
    page(&PageInput { runs: &runs, weighed: &[], command: "oddwell report", version: "oddwell" }).html
}

/// The page with a driver in it, and axe-core where it is to be had.
fn driven(html: &str) -> String {
    let listener = "<script>window.heard=[];addEventListener('error',(e)=>heard.push(String(e.message)));\
                    addEventListener('securitypolicyviolation',(e)=>heard.push('blocked '+e.blockedURI));\
                    console.error=(...words)=>heard.push(words.join(' '));</script>";
    let driver = include_str!("browser.js")
        .replace("BIN", "larkfield.near")
        .replace("PARAMETER", "systematic.bright-luminosity-function");
    let axe =
        std::env::var_os("ODDWELL_AXE").map(|path| std::fs::read_to_string(PathBuf::from(path)).unwrap());
    let axe = axe.map(|text| format!("<script>{text}</script>")).unwrap_or_default();
    let html = html.replacen("<head>", &format!("<head>{listener}"), 1);
    html.replacen("</body>", &format!("{axe}<script>{driver}</script></body>"), 1)
}

fn result_of(dump: &str) -> Value {
    let (_, rest) =
        dump.split_once("<pre id=\"driver\">").unwrap_or_else(|| panic!("the driver did not finish"));
    let (text, _) = rest.split_once("</pre>").unwrap();
    let text = text
        .replace("&lt;", "<")
        .replace("&gt;", ">")
        .replace("&quot;", "\"")
        .replace("&nbsp;", " ")
        .replace("&amp;", "&");
    serde_json::from_str(&text).unwrap()
}

#[test]
fn the_page_works_in_a_browser_and_asks_for_nothing() {
    let html = demo_page();
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("page.html");
    std::fs::write(&file, driven(&html)).unwrap();
    for size in [(1280, 900), (390, 844)] {
        let Some((dump, log)) = open(&file, size, &["--dump-dom"]).unwrap() else {
            assert!(std::env::var_os("CI").is_none(), "continuous integration must have Chromium");
            eprintln!("skipped: no Chromium; apt-get install chromium");
            return;
        };
        let found = result_of(&dump);
        let text = |pointer: &str| found.pointer(pointer).and_then(Value::as_str).unwrap_or_default();
        let number = |pointer: &str| found.pointer(pointer).and_then(Value::as_f64).unwrap_or(f64::NAN);
        assert_eq!(found["heard"], Value::Array(Vec::new()), "{size:?}");
        assert!(!log.contains("CONSOLE"), "{log}");
        assert_eq!(found["requests"], Value::Array(Vec::new()), "{size:?}");
        assert_eq!(text("/ready"), "yes");
        // Nothing sticks out of the window but what scrolls inside its own box.
        assert!(number("/overflow") <= 0.0, "{size:?}: {} pixels", number("/overflow"));
        assert!(
            text("/hover/shown").contains("larkfield.near") && found["hover"]["gone"] == true,
            "{}",
            found["hover"]
        );
        let keys = &found["keys"];
        assert!(
            text("/keys/first").contains("larkfield.near") && text("/keys/first") != text("/keys/second"),
            "{keys}"
        );
        assert!(text("/keys/highlighted/text").contains("larkfield.near") && keys["here"] == 0, "{keys}");
        assert!(keys["after"]["text"].is_null() && keys["after"]["marks"] == 0, "{keys}");
        // A bin lights up in its panels, in tables, and with all that is its own.
        let choose = &found["choose"];
        assert!(number("/choose/on/marks") > 60.0 && number("/choose/on/names") > 20.0, "{choose}");
        assert!(number("/choose/parameters") > 0.0 && choose["off"]["marks"] == 0, "{choose}");
        let parameter = &found["parameter"];
        assert!(number("/parameter/on/marks") > 3.0 && parameter["off"]["text"].is_null(), "{parameter}");
        let save = &found["save"];
        assert!(text("/save/name").ends_with(".svg") && number("/save/size") > 1000.0, "{save}");
        assert_eq!((text("/save/type"), &save["buttons"]), ("image/svg+xml", &save["figures"]));
        let print = &found["print"];
        assert!(
            print["during"] == 0 && print["before"] == print["after"] && number("/print/before") > 5.0,
            "{print}"
        );
        eprintln!("{size:?}: opened in {:.0} ms", number("/milliseconds"));
        if std::env::var_os("ODDWELL_AXE").is_some() {
            assert_eq!(found["axe"]["violations"], Value::Array(Vec::new()), "{size:?}");
            // Had nothing been looked at, nothing would be found.
            assert!(number("/axe/passes") > 20.0);
            eprintln!("{size:?}: axe-core passes {} rules", number("/axe/passes"));
        }
    }
}
