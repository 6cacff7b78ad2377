//! From a mode table to a model in which nothing is silently zero: given constants, defaults by roles and contact, and
//! one picture per water.

use std::collections::BTreeMap;

use super::local_pair;
use super::position::{Model, Picture, Resonance, Sourced};
use crate::library::defaults::{Contact, Defaults, Role, omega_x, omega_x_deuterated};
use crate::mode::{Basis, ConstantKind, ModeIndex, ModeTable, MoietyKind, Motion, Origin};
use crate::note::{Note, Noted};

/// Neglected higher terms: standard uncertainty per quantum above the first, cm⁻¹ (judgement: second-order formulas
/// miss two-quanta levels of gas water by 1–5 cm⁻¹ once resonances are treated).
pub const FLOOR: f64 = 2.0;

/// Coupling λ of the two OH of one water and its uncertainty, cm⁻¹, where the defaults file gives none: a fit to the
/// stretching levels of gas water gives −43.9 (half the splitting of its fundamentals −49).
const COUPLING: (f64, f64) = (-45.0, 15.0);

/// An OH envelope narrower than this counts as a resolved site, cm⁻¹.
const RESOLVED: f64 = 60.0;

/// How far from exact a 2:1 pair in one moiety may be to be mentioned, cm⁻¹.
const NEAR: f64 = 60.0;

/// Resolves the constants of a table.
///
/// # Method
/// Given constants stand. Missing x_ij come from the defaults by the roles of the two modes and the contact of their
/// moieties. The two OH stretches of a water are described by one picture (see [`Picture`]), named in
/// [`Model::pictures`]. A harmonic table is converted: νᵢ = ωᵢ + xᵢᵢ (1 + dᵢ) + ½ Σ xᵢⱼ dⱼ (+ gᵢᵢ for d = 2, 2 gᵢᵢ for
/// d = 3).
pub fn resolve(table: &ModeTable) -> Noted<Model> {
    let mut notes = Vec::new();
    let nu: Vec<f64> = table.modes.iter().map(|m| m.wavenumber.inverse_cm()).collect();
    let mut model = assemble(table, &nu);
    if table.basis == Basis::Harmonic {
        // Defaults depend on the fundamentals, which depend on the defaults: four rounds settle to 0.01 cm⁻¹.
        let mut fundamentals: Vec<f64> = nu.clone();
        for _ in 0..4 {
            model = assemble(table, &fundamentals);
            fundamentals = (0..nu.len()).map(|i| fundamental(&model, nu[i], i)).collect();
        }
        let spread: Vec<f64> = (0..nu.len()).map(|i| conversion_sigma(&model, i)).collect();
        for i in 0..nu.len() {
            model.nu[i] = fundamentals[i].max(1.0);
            model.nu_sigma[i] = model.nu_sigma[i].hypot(spread[i]);
        }
        notes.push(Note::new(
            "the table holds harmonic wavenumbers; fundamentals follow from the anharmonic constants (do not scale as well)",
        ));
    }
    for (moiety, picture, reason) in &model.pictures {
        let name = &table.moieties[*moiety].name;
        let picture = match picture {
            Picture::Given => "constants as given",
            Picture::LocalPair => "local pair",
            Picture::Envelope => "broad envelope",
            Picture::SingleBond => "separate bonds",
        };
        notes.push(Note::new(format!("picture of {name}: {picture} ({reason})")));
    }
    notes.extend(near_resonances(table, &model));
    let defaulted = model.x.iter().filter(|x| x.origin == Origin::Defaulted).count();
    let given = model.x.iter().filter(|x| x.origin == Origin::Given).count();
    let computed = model.x.iter().filter(|x| x.origin == Origin::Computed).count();
    notes.push(Note::new(format!(
        "anharmonic constants: {given} given, {defaulted} from the defaults by pair of motions, {computed} computed from pictures"
    )));
    Noted { value: model, notes }
}

/// νᵢ from ωᵢ and the constants.
fn fundamental(model: &Model, omega: f64, i: ModeIndex) -> f64 {
    let d = f64::from(model.degeneracy[i]);
    let others: f64 = (0..model.modes())
        .filter(|j| *j != i)
        .map(|j| 0.5 * model.x(i, j).value * f64::from(model.degeneracy[j]))
        .sum();
    let g = model.g[i].as_ref().map_or(0.0, |g| g.value) * if model.degeneracy[i] == 3 { 2.0 } else { 1.0 };
    omega + model.x(i, i).value * (1.0 + d) + others + if model.degeneracy[i] > 1 { g } else { 0.0 }
}

/// Standard uncertainty of the step from harmonic to fundamental.
fn conversion_sigma(model: &Model, i: ModeIndex) -> f64 {
    let d = f64::from(model.degeneracy[i]);
    let others: f64 = (0..model.modes())
        .filter(|j| *j != i)
        .map(|j| (0.5 * model.x(i, j).sigma * f64::from(model.degeneracy[j])).powi(2))
        .sum();
    ((model.x(i, i).sigma * (1.0 + d)).powi(2) + others).sqrt()
}

fn assemble(table: &ModeTable, nu: &[f64]) -> Model {
    let n = table.modes.len();
    let roles: Vec<Role> = (0..n).map(|i| Role::of(table, i)).collect();
    let mut model = Model::harmonic(nu.to_vec());
    model.floor = FLOOR;
    for (i, mode) in table.modes.iter().enumerate() {
        model.nu_sigma[i] = mode.sigma;
        model.degeneracy[i] = mode.degeneracy;
        if mode.degeneracy > 1 {
            model.l_spread[i] = match roles[i] {
                Role::Xo3(3) => 4.0,
                Role::Xo4(3) => 2.0,
                _ => 1.0,
            };
        }
    }
    let mut known: BTreeMap<(Role, Role, &'static str), Sourced> = BTreeMap::new();
    for i in 0..n {
        for j in 0..=i {
            *model.x_mut(i, j) = default_x(table, &roles, nu, i, j, &mut known);
        }
    }
    choose_pictures(table, &roles, &mut model);
    for constant in &table.constants {
        let sourced = Sourced {
            value: constant.value.0,
            sigma: constant.sigma,
            origin: Origin::Given,
            source: constant.source.clone(),
        };
        match constant.kind {
            ConstantKind::X => *model.x_mut(constant.a, constant.b) = sourced,
            ConstantKind::G if constant.a == constant.b => model.g[constant.a] = Some(sourced),
            ConstantKind::G => model.g_pairs.push((constant.a, constant.b, sourced)),
            kind => {
                let (a, b, c) = (constant.a, constant.b, constant.c);
                model.resonances.push(Resonance { kind, a, b, c, element: sourced });
            }
        }
    }
    for (i, g) in model.g.iter().enumerate() {
        if g.is_some() {
            model.l_spread[i] = 0.0;
        }
    }
    model
}

/// The default x_ij.
fn default_x(
    table: &ModeTable,
    roles: &[Role],
    nu: &[f64],
    i: ModeIndex,
    j: ModeIndex,
    known: &mut BTreeMap<(Role, Role, &'static str), Sourced>,
) -> Sourced {
    if i == j {
        let own = match roles[i] {
            Role::OhStretch => Some(omega_x(nu[i])),
            Role::OdStretch => Some(omega_x_deuterated(nu[i])),
            _ => None,
        };
        if let Some((value, sigma)) = own {
            let source =
                "ωx from the stretch wavenumber (field maps of Auer & Skinner 2008, Gruenbaum and others 2013)";
            return Sourced { value: -value, sigma, origin: Origin::Defaulted, source: source.to_owned() };
        }
    }
    let relation =
        if i == j { "same-mode" } else { Contact::of(table, table.modes[i].moiety, table.modes[j].moiety).key() };
    let key = (roles[i].max(roles[j]), roles[i].min(roles[j]), relation);
    known
        .entry(key)
        .or_insert_with(|| match Defaults::bundled().find("x", roles[i], roles[j], relation) {
            Some(row) => Sourced {
                value: row.mean.unwrap_or(0.0),
                sigma: row.sigma.unwrap_or(5.0),
                origin: Origin::Defaulted,
                source: row.source.clone(),
            },
            None => Sourced {
                value: 0.0,
                sigma: 5.0,
                origin: Origin::Defaulted,
                source: "no rule for this pair: zero within 5 cm⁻¹ (judgement)".to_owned(),
            },
        })
        .clone()
}

/// Chooses and applies one picture per water.
fn choose_pictures(table: &ModeTable, roles: &[Role], model: &mut Model) {
    let stretch = |i: &ModeIndex| matches!(roles[*i], Role::OhStretch | Role::OdStretch);
    for (moiety, entry) in table.moieties.iter().enumerate() {
        if entry.kind != MoietyKind::Water {
            continue;
        }
        let mut stretches: Vec<ModeIndex> =
            (0..table.modes.len()).filter(|i| table.modes[*i].moiety == moiety).filter(stretch).collect();
        stretches.sort_by(|a, b| model.nu[*a].total_cmp(&model.nu[*b]).then(a.cmp(b)));
        let given = table.constants.iter().any(|k| {
            stretches.contains(&k.a)
                && stretches.contains(&k.b)
                && (k.a != k.b || (k.kind == ConstantKind::X && stretches.len() > 1))
        });
        let (picture, reason) = match stretches.as_slice() {
            [] => continue,
            _ if given => (Picture::Given, "the table has constants of its stretching pair".to_owned()),
            &[low, high] => local_pair_picture(model, roles, low, high),
            &[one] => single_stretch_picture(table, roles, model, moiety, one),
            many => {
                for (k, &i) in many.iter().enumerate() {
                    for &j in &many[..k] {
                        *model.x_mut(i, j) = Sourced {
                            value: 0.0,
                            sigma: 15.0,
                            origin: Origin::Defaulted,
                            source: "bonds of unknown partnership: zero within 15 cm⁻¹ (judgement)".to_owned(),
                        };
                    }
                }
                (Picture::SingleBond, format!("{} stretches are listed, their partnership is not", many.len()))
            }
        };
        model.pictures.push((moiety, picture, reason));
    }
}

/// Two Morse bonds with harmonic coupling, folded into constants that give the two-quanta levels exactly.
fn local_pair_picture(model: &mut Model, roles: &[Role], low: ModeIndex, high: ModeIndex) -> (Picture, String) {
    let (nu_low, nu_high) = (model.nu[low], model.nu[high]);
    let bond = |i: ModeIndex| {
        if roles[i] == Role::OdStretch { omega_x_deuterated(model.nu[i]) } else { omega_x(model.nu[i]) }
    };
    let ((wx_low, s_low), (wx_high, s_high)) = (bond(low), bond(high));
    let (lambda, s_lambda) = Defaults::bundled()
        .find("lambda", roles[low], roles[high], Contact::SameMoiety.key())
        .and_then(|row| Some((row.mean?, row.sigma?)))
        .unwrap_or(COUPLING);
    let at = |a: f64, b: f64, l: f64| local_pair::effective_constants(nu_low, nu_high, a, b, l);
    let centre = at(wx_low, wx_high, lambda);
    // Finite differences over one sigma: the two ωx follow one rule, so they move together.
    let moved = [
        at(wx_low + s_low, wx_high + s_high, lambda),
        at(wx_low, wx_high, lambda + s_lambda),
        at(wx_low, wx_high, lambda - s_lambda),
    ];
    let spread = |pick: fn(&local_pair::EffectiveConstants) -> f64| {
        let c = pick(&centre);
        let by_lambda = (pick(&moved[1]) - c).abs().max((pick(&moved[2]) - c).abs());
        (pick(&moved[0]) - c).hypot(by_lambda).max(2.0)
    };
    let values = [
        (low, low, centre.x_ll, spread(|k| k.x_ll)),
        (high, low, centre.x_lh, spread(|k| k.x_lh)),
        (high, high, centre.x_hh, spread(|k| k.x_hh)),
    ];
    for (i, j, value, sigma) in values {
        let source = format!("local pair: ωx {wx_low:.0} and {wx_high:.0}, coupling {lambda:.0} cm⁻¹");
        *model.x_mut(i, j) = Sourced { value, sigma, origin: Origin::Computed, source };
    }
    (
        Picture::LocalPair,
        format!(
            "two Morse bonds, ωx {wx_low:.0} and {wx_high:.0} cm⁻¹, coupling {lambda:.0} cm⁻¹; no x of the pair is added to it"
        ),
    )
}

/// One listed stretch: a resolved bond, or a broad envelope that stands for both.
fn single_stretch_picture(
    table: &ModeTable,
    roles: &[Role],
    model: &mut Model,
    moiety: usize,
    one: ModeIndex,
) -> (Picture, String) {
    let given = table.modes[one].fwhm;
    let width = given.unwrap_or_else(|| Defaults::bundled().width(roles[one], model.nu[one]).0);
    if width < RESOLVED {
        let reason = format!("one stretch {width:.0} cm⁻¹ wide is listed; its overtone is that of a bond");
        return (Picture::SingleBond, reason);
    }
    // Measured maxima in ice and liquid water (Warren & Brandt 2008; Segelstein 1981): stretch + bend lies 0.4 widths
    // above the sum of maxima, two stretches 0.6 widths above twice the maximum; one sigma is 0.2 widths.
    for j in 0..table.modes.len() {
        let same_water = table.modes[j].moiety == moiety;
        if j != one && same_water && matches!(table.modes[j].motion, Motion::HohBend | Motion::Libration) {
            let x = model.x_mut(one, j);
            x.value += 0.4 * width;
            x.sigma = x.sigma.hypot(0.2 * width);
            x.origin = Origin::Computed;
            x.source = format!(
                "broad envelope of {width:.0} cm⁻¹: maximum of the sum lies 0.4 widths above the sum of maxima"
            );
        }
    }
    *model.x_mut(one, one) = Sourced {
        value: 0.3 * width,
        sigma: 0.2 * width,
        origin: Origin::Computed,
        source: format!("broad envelope of {width:.0} cm⁻¹: two stretches lie 0.6 widths above twice the maximum"),
    };
    let known = if given.is_some() { "given" } else { "expected" };
    (
        Picture::Envelope,
        format!("one stretch, {known} {width:.0} cm⁻¹ wide, stands for both bonds; maxima shift, 2ν − 2ωx is not used"),
    )
}

/// Near 2:1 pairs inside a moiety that no given constant treats.
fn near_resonances(table: &ModeTable, model: &Model) -> Vec<Note> {
    let mut found = Vec::new();
    for a in 0..table.modes.len() {
        for b in 0..table.modes.len() {
            if a == b || table.modes[a].moiety != table.modes[b].moiety {
                continue;
            }
            let gap = model.nu[a] - 2.0 * model.nu[b] - 2.0 * model.x(b, b).value;
            let treated = model.resonances.iter().any(|r| r.kind == ConstantKind::Fermi && r.a == a && r.b == b);
            if gap.abs() < NEAR && !treated {
                found.push(format!("{} and 2 {} ({gap:+.0} cm⁻¹)", table.modes[a].id, table.modes[b].id));
            }
        }
    }
    if found.is_empty() {
        return Vec::new();
    }
    let more = if found.len() > 4 { format!(" and {} more", found.len() - 4) } else { String::new() };
    found.truncate(4);
    vec![Note::new(format!(
        "near Fermi pairs without a constant in the table: {}{more}; they may share strength and repel each other",
        found.join(", ")
    ))]
}
