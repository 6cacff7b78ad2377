//! The bundled tables, by name.

use crate::mode::ModeTable;
use crate::note::Noted;
use crate::read::{Complaints, constants, mode_table};

/// One bundled table as text.
pub struct Bundled {
    /// Name on the command line.
    pub name: &'static str,
    /// The mode table.
    pub modes: &'static str,
    /// Its constants, where there are any.
    pub constants: Option<&'static str>,
}

/// `bundle!(name)` or `bundle!(name + constants)`.
macro_rules! bundle {
    ($name:literal) => {
        Bundled { name: $name, modes: include_str!(concat!("../../mode_tables/", $name, ".csv")), constants: None }
    };
    ($name:literal + constants) => {
        Bundled {
            name: $name,
            modes: include_str!(concat!("../../mode_tables/", $name, ".csv")),
            constants: Some(include_str!(concat!("../../mode_tables/", $name, ".constants.csv"))),
        }
    };
}

/// All bundled tables, by name.
pub const BUNDLED: &[Bundled] = &[
    bundle!("anhydrite"),
    bundle!("bassanite"),
    bundle!("calcite"),
    bundle!("calcium_nitrate_tetrahydrate"),
    bundle!("carbon_dioxide" + constants),
    bundle!("epsomite"),
    bundle!("gypsum"),
    bundle!("hydrogen_cyanide" + constants),
    bundle!("kieserite"),
    bundle!("magnesium_chloride_hexahydrate"),
    bundle!("magnesium_perchlorate_hexahydrate"),
    bundle!("natron"),
    bundle!("niter"),
    bundle!("sodium_carbonate"),
    bundle!("sodium_perchlorate"),
    bundle!("sodium_perchlorate_monohydrate"),
    bundle!("sulfur_dioxide" + constants),
    bundle!("water" + constants),
];

/// Names of the bundled tables, in order.
pub fn names() -> impl Iterator<Item = &'static str> {
    BUNDLED.iter().map(|b| b.name)
}

/// The bundled table called `name` (blanks and hyphens count as underscores, case is ignored); `None` when there is
/// none of that name.
///
/// # Errors
/// Complaints about the bundled text itself; a test reads all of them, so none is met in practice.
pub fn bundled(name: &str) -> Option<Result<Noted<ModeTable>, Complaints>> {
    let plain = name.trim().to_lowercase().replace([' ', '-'], "_");
    let found = BUNDLED.iter().find(|b| b.name == plain)?;
    Some(read(found))
}

/// Reads one bundled table with its constants.
///
/// # Errors
/// Complaints about the text.
pub fn read(bundled: &Bundled) -> Result<Noted<ModeTable>, Complaints> {
    let mut noted = mode_table::read(&format!("{}.csv", bundled.name), bundled.modes)?;
    if let Some(text) = bundled.constants {
        let constants = constants::read(&format!("{}.constants.csv", bundled.name), text, &noted.value)?;
        noted.value.constants = constants.value;
        noted.notes.extend(constants.notes);
    }
    Ok(noted)
}
