//! Inputs named on the command line: a file, or the name of a bundled table.

use std::path::{Path, PathBuf};

use super::Failure;
use crate::library;
use crate::mode::ModeTable;
use crate::note::Noted;
use crate::physics::pictures::mixed_pictures;
use crate::read::{Complaint, Complaints, constants, delimited, mode_table};

/// Loads a mode table with its constants: a file when `name` is one, else the bundled table of that name.
///
/// The constants of `NAME.csv` are read from `NAME.constants.csv` beside it when that file is there.
///
/// # Errors
/// [`Failure::Input`] with all complaints; a name that is neither file nor bundled table is told the near ones.
pub fn load_table(name: &str) -> Result<Noted<ModeTable>, Failure> {
    load_table_with(name, None)
}

/// [`load_table`] with the constants of another file.
///
/// # Errors
/// As for [`load_table`].
pub fn load_table_with(name: &str, constants_file: Option<&Path>) -> Result<Noted<ModeTable>, Failure> {
    let path = Path::new(name);
    let mut noted = if path.is_file() {
        let mut noted = mode_table::read_file(path)?;
        let beside = beside(path);
        if constants_file.is_none() && beside.is_file() {
            let constants = constants::read_file(&beside, &noted.value)?;
            noted.value.constants = constants.value;
            noted.notes.extend(constants.notes);
        }
        noted
    } else if let Some(result) = library::bundled(name) {
        result?
    } else {
        let plain = name.to_lowercase();
        let near = delimited::closest(&plain, library::names())
            .or_else(|| library::names().find(|known| known.contains(&plain) || plain.contains(known)));
        let hint = match near {
            Some(near) => format!("did you mean `{near}`? `bandwright tables` lists what is bundled"),
            None => "`bandwright tables` lists what is bundled".to_owned(),
        };
        let complaint = Complaint::about_file(name, "a mode table: a file or a bundled name", "neither").hint(hint);
        return Err(Failure::Input(complaint.into()));
    };
    if let Some(file) = constants_file {
        let constants = constants::read_file(file, &noted.value)?;
        noted.value.constants = constants.value;
        noted.notes.extend(constants.notes);
    }
    let mixed = mixed_pictures(&noted.value).into_iter().map(|found| {
        let expected = "constants of one picture for the O–H stretches of a water";
        Complaint::about_file(&noted.value.name, expected, &noted.value.moieties[found.moiety].name).hint(found.reason)
    });
    Ok(Complaints(mixed.collect()).or(noted)?)
}

/// `NAME.constants.csv` beside `NAME.csv`.
fn beside(path: &Path) -> PathBuf {
    path.with_extension("constants.csv")
}
