//! What is left after presolving falls into parts with no constraint between them. Each is cut out
//! as an index of its own and solved on its own.

use petgraph::unionfind::UnionFind;

use super::index::{Index, Lists};
use super::presolve::{Demand, Live, by_group};

/// A part of a larger index.
#[derive(Debug)]
pub(super) struct Part {
    pub(super) index: Index,
    /// The variable of the larger index that each variable here is.
    pub(super) vars: Vec<u32>,
    /// The row of the larger index that each row here stands for.
    pub(super) rows: Vec<u32>,
    /// (row here, row of the larger index) where the latter says the same, but no more.
    pub(super) twins: Vec<(u32, u32)>,
}

/// An index with everything settled taken out.
#[derive(Debug)]
pub(super) struct Split {
    /// What is connected, in the order of first groups.
    pub(super) parts: Vec<Part>,
    /// The part of every group that is not settled; else the greatest number there is.
    pub(super) part_of: Vec<u32>,
    /// The settled variables, one for each settled group.
    pub(super) settled: Vec<u32>,
    /// What the settled variables are worth together.
    pub(super) settled_value: i64,
}

/// Cuts what is left into its connected parts.
pub(super) fn split(index: &Index, live: &Live) -> Split {
    let open: Vec<bool> = live.count.iter().map(|&count| count > 1).collect();
    let settled: Vec<u32> =
        (0..index.groups()).filter_map(|group| live.settled(index, group)).collect();
    let part_of = label(index, live, &open);
    let count =
        part_of.iter().filter(|&&part| part != u32::MAX).max().map_or(0, |&last| last as usize + 1);
    let groups: Vec<(u32, u32)> = (0u32..)
        .zip(&part_of)
        .filter(|&(_, &part)| part != u32::MAX)
        .map(|(group, &part)| (part, group))
        .collect();
    let groups = Lists::collect(count, &groups);
    let mut seams = vec![Seam::default(); count];
    for row in 0..index.slack.len() as u32 {
        if let Some(group) = first_open_group(index, live, &open, row) {
            seams[part_of[group as usize] as usize].rows.push(row);
        }
    }
    for any_of in 0..index.any_of_rows.len() as u32 {
        let rows = index.any_of_rows[any_of].iter();
        let mut groups = rows.filter_map(|&row| first_open_group(index, live, &open, row));
        if let Some(group) = groups.next().filter(|_| live.any_ofs[any_of as usize]) {
            seams[part_of[group as usize] as usize].any_ofs.push(any_of);
        }
    }
    let parts = (0u32..)
        .zip(&seams)
        .map(|(part, seam)| cut_out(index, live, &groups[part], seam))
        .collect();
    let settled_value = value_of_settled(index, &settled);
    Split { parts, part_of, settled, settled_value }
}

/// Constraints of a part, by their positions in the larger index.
#[derive(Debug, Clone, Default)]
pub(super) struct Seam {
    pub(super) rows: Vec<u32>,
    pub(super) any_ofs: Vec<u32>,
}

/// What settled variables are worth together.
pub(super) fn value_of_settled(index: &Index, settled: &[u32]) -> i64 {
    let mut is_settled = vec![false; index.value.len()];
    settled.iter().for_each(|&var| is_settled[var as usize] = true);
    let is_settled = |var: u32| is_settled[var as usize];
    let cost = |var: u32| -> i64 {
        let later = index.soft[var].iter().filter(|&&(other, _)| other > var && is_settled(other));
        later.map(|&(_, cost)| cost).sum()
    };
    settled.iter().map(|&var| index.value[var as usize] - cost(var)).sum()
}

fn first_open_group(index: &Index, live: &Live, open: &[bool], row: u32) -> Option<u32> {
    if !matches!(live.rows[row as usize], Demand::Firm | Demand::Alternative) {
        return None;
    }
    matters(index, live, open, row).next()
}

/// Open groups whose choice makes a difference to a row.
fn matters<'a>(
    index: &'a Index,
    live: &'a Live,
    open: &'a [bool],
    row: u32,
) -> impl Iterator<Item = u32> + 'a {
    by_group(index, &index.row_terms[row]).filter_map(move |run| {
        let group = index.group_of[run[0].0 as usize];
        let (least, greatest) = live.range(index, run);
        (open[group as usize] && least < greatest).then_some(group)
    })
}

/// The part of every open group; parts are numbered in the order of their first groups.
fn label(index: &Index, live: &Live, open: &[bool]) -> Vec<u32> {
    let mut sets = UnionFind::<u32>::new(open.len());
    let mut join = |groups: &mut dyn Iterator<Item = u32>| {
        let Some(first) = groups.next() else { return };
        for other in groups {
            sets.union(first, other);
        }
    };
    for row in 0..index.slack.len() as u32 {
        if live.rows[row as usize] == Demand::Firm {
            join(&mut matters(index, live, open, row));
        }
    }
    for any_of in 0..index.any_of_rows.len() as u32 {
        if live.any_ofs[any_of as usize] {
            let rows = index.any_of_rows[any_of].iter();
            let rows = rows.filter(|&&row| live.rows[row as usize] == Demand::Alternative);
            join(&mut rows.flat_map(|&row| matters(index, live, open, row)));
        }
    }
    let both_open = |a: u32, b: u32| {
        let (g, h) = (index.group_of[a as usize] as usize, index.group_of[b as usize] as usize);
        live.vars[a as usize] && live.vars[b as usize] && open[g] && open[h]
    };
    for var in 0..index.value.len() as u32 {
        let soft = index.soft[var].iter().map(|&(other, _)| other);
        for other in index.hard[var].iter().copied().chain(soft).filter(|&other| other > var) {
            if both_open(var, other) {
                sets.union(index.group_of[var as usize], index.group_of[other as usize]);
            }
        }
    }
    number(&mut sets, open)
}

fn number(sets: &mut UnionFind<u32>, open: &[bool]) -> Vec<u32> {
    let mut names = vec![u32::MAX; open.len()];
    let mut next = 0;
    (0u32..)
        .zip(open)
        .map(|(group, &open)| {
            let root = sets.find_mut(group) as usize;
            if open && names[root] == u32::MAX {
                names[root] = next;
                next += 1;
            }
            if open { names[root] } else { u32::MAX }
        })
        .collect()
}

/// Cuts groups out, ascending, with those of the constraints that concern them and nothing open
/// besides.
pub(super) fn cut_out(index: &Index, live: &Live, groups: &[u32], seam: &Seam) -> Part {
    let mut vars = Vec::new();
    let mut first = vec![0];
    let mut group_of = Vec::new();
    for (here, &group) in (0u32..).zip(groups) {
        vars.extend(index.vars(group).filter(|&var| live.vars[var as usize]));
        group_of.resize(vars.len(), here);
        first.push(vars.len() as u32);
    }
    let local = |var: u32| vars.binary_search(&var).ok().map(|var| var as u32);
    let pairs = cut_pairs(index, live, &vars, &local);
    let (mut rows, twins) = cut_firm_rows(index, live, seam, &local);
    let firm_rows = rows.len() as u32;
    let loose: Vec<u32> = seam
        .rows
        .iter()
        .copied()
        .filter(|&row| live.rows[row as usize] == Demand::Alternative)
        .collect();
    rows.extend(loose.iter().map(|&row| CutRow::new(index, live, row, &local)));
    let loose_row = |row: &u32| loose.binary_search(row).ok().map(|row| row as u32 + firm_rows);
    let any_of_rows: Vec<(u32, u32)> = (0u32..)
        .zip(&seam.any_ofs)
        .flat_map(|(here, &any_of)| {
            index.any_of_rows[any_of].iter().filter_map(loose_row).map(move |row| (here, row))
        })
        .collect();
    let row_any_ofs: Vec<(u32, u32)> =
        any_of_rows.iter().map(|&(any_of, row)| (row, any_of)).collect();
    let by_row: Vec<_> = (0u32..)
        .zip(&rows)
        .flat_map(|(here, row)| row.terms.iter().map(move |&term| (here, term)))
        .collect();
    let by_var: Vec<_> = by_row.iter().map(|&(row, (var, delta))| (var, (row, delta))).collect();
    let index = Index {
        first,
        group_of,
        value: pairs.value,
        allowed: vec![true; vars.len()],
        hard: Lists::collect(vars.len(), &pairs.hard),
        soft: Lists::collect(vars.len(), &pairs.soft),
        slack: rows.iter().map(|row| row.slack).collect(),
        firm_rows,
        row_terms: Lists::collect(rows.len(), &by_row),
        var_terms: Lists::collect(vars.len(), &by_var),
        any_of_rows: Lists::collect(seam.any_ofs.len(), &any_of_rows),
        row_any_ofs: Lists::collect(rows.len(), &row_any_ofs),
    };
    Part { index, vars, rows: rows.into_iter().map(|row| row.source).collect(), twins }
}

/// Clashes within a part, and values less the costs of clashes with what is settled.
#[derive(Default)]
struct Pairs {
    hard: Vec<(u32, u32)>,
    soft: Vec<(u32, (u32, i64))>,
    value: Vec<i64>,
}

fn cut_pairs(
    index: &Index,
    live: &Live,
    vars: &[u32],
    local: &impl Fn(u32) -> Option<u32>,
) -> Pairs {
    let settled = |var: u32| {
        live.vars[var as usize]
            && live.count[index.group_of[var as usize] as usize] == 1
            && local(var).is_none()
    };
    let mut pairs = Pairs::default();
    for (here, &var) in (0u32..).zip(vars) {
        let hard = index.hard[var].iter().filter_map(|&other| Some((here, local(other)?)));
        pairs.hard.extend(hard);
        let soft = index.soft[var].iter();
        pairs.soft.extend(soft.filter_map(|&(other, cost)| Some((here, (local(other)?, cost)))));
        let paid = index.soft[var].iter().filter(|&&(other, _)| settled(other));
        let paid: i64 = paid.map(|&(_, cost)| cost).sum();
        pairs.value.push(index.value[var as usize] - paid);
    }
    pairs
}

/// Firm rows; of those with the same terms only the tightest, and the others as its twins.
fn cut_firm_rows(
    index: &Index,
    live: &Live,
    seam: &Seam,
    local: &impl Fn(u32) -> Option<u32>,
) -> (Vec<CutRow>, Vec<(u32, u32)>) {
    let firm = seam.rows.iter().filter(|&&row| live.rows[row as usize] == Demand::Firm);
    let mut rows: Vec<CutRow> = firm.map(|&row| CutRow::new(index, live, row, local)).collect();
    rows.sort_unstable_by(|a, b| (&a.terms, a.slack, a.source).cmp(&(&b.terms, b.slack, b.source)));
    let mut twins = Vec::new();
    rows.dedup_by(|a, kept| {
        let same = a.terms == kept.terms;
        if same {
            twins.push((kept.source, a.source));
        }
        same
    });
    rows.sort_unstable_by_key(|row| row.source);
    for (kept, _) in &mut twins {
        *kept = rows.partition_point(|row| row.source < *kept) as u32;
    }
    (rows, twins)
}

/// What is left of a row.
struct CutRow {
    source: u32,
    slack: i64,
    terms: Vec<(u32, i64)>,
}

impl CutRow {
    /// The terms that are left, and the slack less what is settled or the same whatever is chosen.
    /// A slack may turn negative. A firm row is never dropped for having no terms left: presolve
    /// keeps only rows that can still be broken, so there are some.
    fn new(index: &Index, live: &Live, row: u32, local: &impl Fn(u32) -> Option<u32>) -> Self {
        let mut slack = index.slack[row as usize];
        let mut terms = Vec::new();
        for run in by_group(index, &index.row_terms[row]) {
            let (least, greatest) = live.range(index, run);
            if least == greatest {
                slack -= least;
            } else {
                terms.extend(run.iter().filter_map(|&(var, delta)| Some((local(var)?, delta))));
            }
        }
        Self { source: row, slack, terms }
    }
}
