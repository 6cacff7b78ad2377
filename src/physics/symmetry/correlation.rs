//! From a molecule's group to its site and on to the crystal: restriction, induction, and the choice of axes.

use std::collections::BTreeMap;

use nalgebra::Matrix3;

use super::group::{Irrep, PointGroup};

/// One way a subgroup lies in a group.
#[derive(Clone, Debug)]
pub struct Embedding {
    /// Which axes of the group it takes, for people.
    pub axes: String,
    /// For every element of the subgroup (its own order) the number of the group's element.
    images: Vec<usize>,
}

/// All embeddings of `subgroup` in `group` that restrict some species differently, each once.
///
/// An embedding gives every generator of the subgroup an element of the group of the same trace and determinant, such
/// that products agree.
pub fn embeddings(group: &PointGroup, subgroup: &PointGroup) -> Vec<Embedding> {
    let generators: Vec<Matrix3<f64>> = subgroup.generators().iter().map(|g| subgroup.elements()[*g]).collect();
    let alike = |a: &Matrix3<f64>, b: &Matrix3<f64>| {
        (a.trace() - b.trace()).abs() < 1.0e-6 && (a.determinant() - b.determinant()).abs() < 1.0e-6
    };
    let choices: Vec<Vec<usize>> =
        generators.iter().map(|g| (0..group.order()).filter(|r| alike(&group.elements()[*r], g)).collect()).collect();
    let mut found: BTreeMap<Vec<Vec<(Irrep, u32)>>, Embedding> = BTreeMap::new();
    let mut chosen = Vec::new();
    choose(&choices, &mut chosen, &mut |images| {
        if let Some(map) = homomorphism(group, subgroup, &generators, images)
            && map.iter().enumerate().all(|(h, g)| alike(&subgroup.elements()[h], &group.elements()[*g]))
        {
            let embedding = Embedding { axes: axes(group, &map), images: map };
            let key: Vec<_> = group.irreps().map(|i| restriction(group, subgroup, &embedding, i)).collect();
            found.entry(key).or_insert(embedding);
        }
    });
    let mut list: Vec<Embedding> = found.into_values().collect();
    list.sort_by(|a, b| a.images.cmp(&b.images));
    list
}

fn choose(choices: &[Vec<usize>], chosen: &mut Vec<usize>, visit: &mut impl FnMut(&[usize])) {
    if chosen.len() == choices.len() {
        visit(chosen);
        return;
    }
    for option in &choices[chosen.len()] {
        chosen.push(*option);
        choose(choices, chosen, visit);
        chosen.pop();
    }
}

/// The image of every element of the subgroup when its generators go to `images`; `None` when products disagree.
fn homomorphism(
    group: &PointGroup,
    subgroup: &PointGroup,
    generators: &[Matrix3<f64>],
    images: &[usize],
) -> Option<Vec<usize>> {
    let find = |elements: &[Matrix3<f64>], m: &Matrix3<f64>| elements.iter().position(|e| (e - m).amax() < 1.0e-6);
    let mut map: Vec<Option<usize>> = vec![None; subgroup.order()];
    let start = find(subgroup.elements(), &Matrix3::identity())?;
    map[start] = find(group.elements(), &Matrix3::identity());
    let mut queue = vec![start];
    while let Some(h) = queue.pop() {
        let image = map[h]?;
        for (generator, target) in generators.iter().zip(images) {
            let next = find(subgroup.elements(), &(subgroup.elements()[h] * generator))?;
            let to = find(group.elements(), &(group.elements()[image] * group.elements()[*target]))?;
            match map[next] {
                None => {
                    map[next] = Some(to);
                    queue.push(next);
                }
                Some(already) if already != to => return None,
                Some(_) => {}
            }
        }
    }
    let map: Vec<usize> = map.into_iter().collect::<Option<_>>()?;
    let mut distinct = map.clone();
    distinct.sort_unstable();
    distinct.dedup();
    (distinct.len() == subgroup.order()).then_some(map)
}

/// Which axes an embedding takes: directions of its rotations and reflections in the group's frame.
fn axes(group: &PointGroup, map: &[usize]) -> String {
    let mut parts: Vec<String> = Vec::new();
    for g in map {
        let m = group.elements()[*g];
        let proper = m.determinant() > 0.0;
        let rotation = if proper { m } else { -m };
        let angle = (0.5 * (rotation.trace() - 1.0)).clamp(-1.0, 1.0).acos();
        if angle < 1.0e-6 {
            continue;
        }
        // The axis is the eigenvector of eigenvalue one: a column of R + Rᵀ + (1 − tr R) 1.
        let k = rotation + rotation.transpose() + Matrix3::identity() * (1.0 - rotation.trace());
        let column = (0..3).max_by(|a, b| k.column(*a).norm().total_cmp(&k.column(*b).norm())).unwrap_or(2);
        let v = k.column(column).normalize();
        let sign = if v.iter().copied().find(|c| c.abs() > 1.0e-6).unwrap_or(1.0) < 0.0 { -1.0 } else { 1.0 };
        let plane = !proper && (angle - std::f64::consts::PI).abs() < 1.0e-4;
        let label = if plane { "σ ⊥" } else { "axis" };
        let part = format!("{label} {}", direction(&(v * sign)));
        if !parts.contains(&part) {
            parts.push(part);
        }
    }
    if parts.is_empty() { "no axis".to_owned() } else { parts.join(", ") }
}

fn direction(v: &nalgebra::Vector3<f64>) -> String {
    let along = [("x", 0), ("y", 1), ("z", 2)];
    if let Some((name, _)) = along.into_iter().find(|(_, i)| v[*i].abs() > 0.999) {
        return name.to_owned();
    }
    let largest = v.amax().max(1.0e-9);
    let part = |c: f64| format!("{:.2}", c / largest).trim_end_matches('0').trim_end_matches('.').replace("-0", "0");
    format!("[{} {} {}]", part(v[0]), part(v[1]), part(v[2]))
}

/// What a species of the group becomes in the subgroup.
pub fn restriction(
    group: &PointGroup,
    subgroup: &PointGroup,
    embedding: &Embedding,
    irrep: Irrep,
) -> Vec<(Irrep, u32)> {
    let characters = group.element_characters(irrep);
    let restricted: Vec<f64> = embedding.images.iter().map(|g| characters[*g]).collect();
    subgroup.reduce(&restricted)
}

/// What a species of a site group becomes in the crystal's factor group: the induced representation. Its dimension is
/// that of the species times the number of equivalent sites, |factor group| / |site group|.
pub fn induction(factor: &PointGroup, site: &PointGroup, embedding: &Embedding, irrep: Irrep) -> Vec<(Irrep, u32)> {
    // Frobenius reciprocity: the multiplicity of Γ in the induced representation is that of the site species in Γ
    // restricted to the site, corrected for separably degenerate pairs counted once.
    factor
        .irreps()
        .filter_map(|gamma| {
            let times =
                restriction(factor, site, embedding, gamma).iter().find(|(i, _)| *i == irrep).map_or(0, |r| r.1);
            let pair = |group: &PointGroup, i: Irrep| {
                let c = group.element_characters(i);
                (c.iter().map(|x| x * x).sum::<f64>() / group.order() as f64).round().max(1.0)
            };
            let corrected = (f64::from(times) * pair(site, irrep) / pair(factor, gamma)).round() as u32;
            (corrected > 0).then_some((gamma, corrected))
        })
        .collect()
}

/// `A1+2E` for a content; `-` for nothing.
pub fn content_text(group: &PointGroup, content: &[(Irrep, u32)]) -> String {
    if content.is_empty() {
        return "-".to_owned();
    }
    let part = |(irrep, n): &(Irrep, u32)| {
        if *n == 1 { group.irrep_name(*irrep).to_owned() } else { format!("{n}{}", group.irrep_name(*irrep)) }
    };
    content.iter().map(part).collect::<Vec<_>>().join("+")
}
