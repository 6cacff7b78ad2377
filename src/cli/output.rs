//! Where the answer goes and in which form.

use std::io::{IsTerminal, Write};
use std::path::{Path, PathBuf};

use super::Failure;

/// Form of the answer.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, clap::ValueEnum)]
pub enum Format {
    /// Text for people.
    #[default]
    Table,
    /// Comma-separated values.
    Csv,
    /// JSON.
    Json,
    /// One self-contained page.
    Html,
    /// A figure.
    Svg,
}

/// Options that every command with an answer has.
#[derive(Clone, Debug, Default, clap::Args)]
pub struct OutputOptions {
    /// Form of the answer.
    #[arg(long, value_enum, default_value_t = Format::Table)]
    pub format: Format,
    /// Write to this file instead of standard output (written whole or not at all, never over an input).
    #[arg(long, value_name = "FILE")]
    pub out: Option<PathBuf>,
}

impl OutputOptions {
    /// Whether colour is welcome: a terminal, and `NO_COLOR` unset or empty.
    pub fn colour(&self) -> bool {
        self.out.is_none()
            && std::io::stdout().is_terminal()
            && std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty())
    }

    /// A usage failure for a format that a command does not offer.
    pub fn refuse(&self, command: &str, offered: &str) -> Failure {
        let name = format!("{:?}", self.format).to_lowercase();
        Failure::Usage(format!("`{command}` has no {name} form\n  hint: choose one of {offered} with --format"))
    }

    /// Writes the answer whole or not at all.
    ///
    /// # Errors
    /// [`Failure::Usage`] when the target is one of `inputs`; [`Failure::Write`] when the system refuses.
    pub fn deliver(&self, answer: &[u8], inputs: &[&Path]) -> Result<(), Failure> {
        let Some(target) = &self.out else {
            let mut out = std::io::stdout().lock();
            let result = out.write_all(answer).and_then(|()| out.flush());
            return result.map_err(|error| Failure::Write { target: "standard output".to_owned(), error });
        };
        let real = |path: &Path| std::fs::canonicalize(path).ok();
        if inputs.iter().any(|input| real(input).is_some() && real(input) == real(target)) {
            return Err(Failure::Usage(format!(
                "--out {} is an input of this command\n  hint: choose another file",
                target.display()
            )));
        }
        let folder = target.parent().filter(|p| !p.as_os_str().is_empty()).unwrap_or(Path::new("."));
        let write = || -> std::io::Result<()> {
            let mut file = tempfile::NamedTempFile::new_in(folder)?;
            file.write_all(answer)?;
            file.as_file().sync_all()?;
            // A temporary file is private; the answer should have the usual permissions of a new file.
            #[cfg(unix)]
            {
                use std::os::unix::fs::PermissionsExt;
                let mode = std::fs::metadata(target).map_or(0o644, |m| m.permissions().mode());
                file.as_file().set_permissions(std::fs::Permissions::from_mode(mode))?;
            }
            file.persist(target).map_err(|e| e.error)?;
            Ok(())
        };
        write().map_err(|error| Failure::Write { target: target.display().to_string(), error })
    }
}
