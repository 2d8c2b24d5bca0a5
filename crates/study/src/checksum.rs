//! Checksums of input files.

use crate::record::InputFile;
use crate::resolve::Study;
use sha2::{Digest, Sha256};
use std::path::Path;

/// SHA-256 of bytes, lower-case hexadecimal.
pub(crate) fn sha256(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}

/// SHA-256 of a file that has just been read; empty if it vanished meanwhile.
pub(crate) fn file_sha256(path: &Path) -> String {
    std::fs::read(path).map(|bytes| sha256(&bytes)).unwrap_or_default()
}

/// The inputs of a study, the study file first.
pub(crate) struct InputHashes {
    inputs: Vec<InputFile>,
}

impl InputHashes {
    pub(crate) fn new(study: &Study) -> InputHashes {
        let source = &study.file.source;
        let sha256 = sha256(source.text().as_bytes());
        InputHashes { inputs: vec![InputFile { path: source.name().to_owned(), sha256 }] }
    }

    pub(crate) fn add(&mut self, path: &Path, sha256: String) {
        let path = path.display().to_string();
        if self.inputs.iter().all(|known| known.path != path) {
            self.inputs.push(InputFile { path, sha256 });
        }
    }

    pub(crate) fn finish(self) -> Vec<InputFile> {
        self.inputs
    }
}
