//! Files on the host.

use core::ffi::CStr;
use core::fmt::{self, Write as _};

use heapless::String;
use semihosting::fs::File;
use semihosting::io::{Error, ErrorKind, Result, Write as _};

/// Longest path of a file.
const PATH: usize = 512;
/// Room for the arguments of the program.
const ARGUMENTS: usize = 512;
/// Text is written in pieces of this many bytes.
const PIECE: usize = 512;

/// The directory that the files go to.
pub(crate) struct Directory(String<PATH>);

impl Directory {
    /// The first argument of the program, else the current directory.
    pub(crate) fn from_arguments() -> Self {
        let mut path = String::new();
        if let Ok(arguments) = semihosting::experimental::env::args::<ARGUMENTS>()
            && let Some(Ok(argument)) = (&arguments).nth(1)
        {
            // Shorter than the path; if not, opening a file fails.
            let _ = path.push_str(argument);
        } else {
            let _ = path.push('.');
        }
        Self(path)
    }

    /// Creates a file of raw bytes.
    pub(crate) fn write(&self, name: &str, contents: &[u8]) -> Result<()> {
        self.create(name)?.write_all(contents)
    }

    /// Creates a file of text; `print` prints it.
    pub(crate) fn print(
        &self,
        name: &str,
        print: impl FnOnce(&mut Text) -> fmt::Result,
    ) -> Result<()> {
        let mut text = Text {
            file: self.create(name)?,
            piece: String::new(),
        };
        let printed = print(&mut text).and_then(|()| text.flush());
        printed.map_err(|fmt::Error| Error::from(ErrorKind::Other))
    }

    fn create(&self, name: &str) -> Result<File> {
        let mut path: String<PATH> = String::new();
        write!(path, "{}/{name}\0", self.0).map_err(|fmt::Error| Error::from(ErrorKind::Other))?;
        let path = CStr::from_bytes_with_nul(path.as_bytes())
            .map_err(|_| Error::from(ErrorKind::Other))?;
        File::create(path)
    }
}

/// A text file that is being printed to.
pub(crate) struct Text {
    file: File,
    piece: String<PIECE>,
}

impl Text {
    fn flush(&mut self) -> fmt::Result {
        let written = self.file.write_all(self.piece.as_bytes());
        self.piece.clear();
        written.map_err(|_| fmt::Error)
    }
}

impl fmt::Write for Text {
    fn write_str(&mut self, text: &str) -> fmt::Result {
        if self.piece.push_str(text).is_err() {
            self.flush()?;
            self.piece.push_str(text).map_err(|_| fmt::Error)?;
        }
        Ok(())
    }
}
