//! A model turned inside out: for every candidate, what it takes part in. All candidates of all
//! groups are numbered in one sequence; a number in it is called a *variable* (`var`).

use super::model::{Choice, Cost, Defect, Model, Row};

/// Lists of items, end to end in one allocation.
#[derive(Debug, Clone)]
pub(super) struct Lists<T> {
    starts: Vec<u32>,
    items: Vec<T>,
}

impl<T: Copy> Lists<T> {
    /// Sorts `(list, item)` pairs into `count` lists, keeping their order within each.
    pub(super) fn collect(count: usize, pairs: &[(u32, T)]) -> Self {
        let mut starts = vec![0u32; count + 1];
        for &(list, _) in pairs {
            starts[list as usize + 1] += 1;
        }
        for list in 0..count {
            starts[list + 1] += starts[list];
        }
        let mut order = vec![0u32; pairs.len()];
        let mut next = starts.clone();
        for (position, &(list, _)) in pairs.iter().enumerate() {
            order[next[list as usize] as usize] = position as u32;
            next[list as usize] += 1;
        }
        let items = order.iter().map(|&position| pairs[position as usize].1).collect();
        Self { starts, items }
    }

    pub(super) fn len(&self) -> usize {
        self.starts.len() - 1
    }

    /// Items of all lists together.
    pub(super) fn items_len(&self) -> usize {
        self.items.len()
    }
}

impl<T> std::ops::Index<u32> for Lists<T> {
    type Output = [T];

    fn index(&self, list: u32) -> &[T] {
        let list = list as usize;
        &self.items[self.starts[list] as usize..self.starts[list + 1] as usize]
    }
}

/// A sound [`Model`] with everything looked up in both directions.
#[derive(Debug, Clone)]
pub struct Index {
    /// First variable of every group, and one past the last variable.
    pub(super) first: Vec<u32>,
    pub(super) group_of: Vec<u32>,
    pub(super) value: Vec<i64>,
    pub(super) allowed: Vec<bool>,
    /// Variables that clash hard with this one, ascending.
    pub(super) hard: Lists<u32>,
    /// Variables that cost something together with this one, each once, ascending.
    pub(super) soft: Lists<(u32, i64)>,
    /// Slack of the model's rows, then of the distinct rows of its any-ofs.
    pub(super) slack: Vec<i64>,
    /// How many of the rows are the model's own, which must all hold.
    pub(super) firm_rows: u32,
    /// (variable, delta) of every row, ascending, each variable once, none zero.
    pub(super) row_terms: Lists<(u32, i64)>,
    /// (row, delta) of every variable, ascending.
    pub(super) var_terms: Lists<(u32, i64)>,
    /// Rows of every any-of.
    pub(super) any_of_rows: Lists<u32>,
    /// Any-ofs of every row.
    pub(super) row_any_ofs: Lists<u32>,
}

impl Index {
    /// Indexes a model.
    ///
    /// # Errors
    /// The first [`Defect`] of the model.
    pub fn new(model: &Model) -> Result<Self, Defect> {
        if let Some(defect) = model.defect() {
            return Err(defect);
        }
        let mut first = vec![0u32];
        let mut group_of = Vec::new();
        let mut value = Vec::new();
        let mut allowed = Vec::new();
        for (group, candidates) in model.groups.iter().enumerate() {
            for candidate in &candidates.candidates {
                group_of.push(group as u32);
                value.push(candidate.value);
                allowed.push(candidate.allowed);
            }
            first.push(value.len() as u32);
        }
        let vars = value.len();
        let (hard, soft) = clash_lists(model, &first, vars);
        let rows = RowTable::new(model, &first);
        let (row_terms, var_terms) = both_ways(&rows.terms, vars);
        let by_any_of: Vec<_> =
            rows.any_of_rows.iter().map(|&(row, any_of)| (any_of, row)).collect();
        Ok(Self {
            first,
            group_of,
            value,
            allowed,
            hard,
            soft,
            firm_rows: model.rows.len() as u32,
            row_terms,
            var_terms,
            any_of_rows: Lists::collect(model.any_ofs.len(), &by_any_of),
            row_any_ofs: Lists::collect(rows.slack.len(), &rows.any_of_rows),
            slack: rows.slack,
        })
    }

    /// The same with more firm rows, which come right after the others.
    pub(super) fn with_rows(&self, rows: &[Row]) -> Self {
        let firm = self.firm_rows as usize;
        let added: Vec<_> = rows.iter().map(|row| merged_terms(row, &self.first)).collect();
        let old = |row: u32| self.row_terms[row].to_vec();
        let count = self.slack.len() as u32;
        let terms: Vec<Vec<(u32, i64)>> = (0..self.firm_rows)
            .map(old)
            .chain(added)
            .chain((self.firm_rows..count).map(old))
            .collect();
        let mut slack = self.slack.clone();
        slack.splice(firm..firm, rows.iter().map(|row| row.slack));
        let by_any_of: Vec<(u32, u32)> = (0..self.any_of_rows.len() as u32)
            .flat_map(|any_of| self.any_of_rows[any_of].iter().map(move |&row| (any_of, row)))
            .map(|(any_of, row)| (any_of, row + rows.len() as u32))
            .collect();
        let by_row: Vec<(u32, u32)> =
            by_any_of.iter().map(|&(any_of, row)| (row, any_of)).collect();
        let (row_terms, var_terms) = both_ways(&terms, self.value.len());
        Self {
            slack,
            firm_rows: self.firm_rows + rows.len() as u32,
            row_terms,
            var_terms,
            any_of_rows: Lists::collect(self.any_of_rows.len(), &by_any_of),
            row_any_ofs: Lists::collect(terms.len(), &by_row),
            ..self.clone()
        }
    }

    pub(super) fn groups(&self) -> u32 {
        (self.first.len() - 1) as u32
    }

    /// The variables of a group, candidate 0 first.
    pub(super) fn vars(&self, group: u32) -> std::ops::Range<u32> {
        self.first[group as usize]..self.first[group as usize + 1]
    }

    pub(super) fn allowed_vars(&self, group: u32) -> impl Iterator<Item = u32> + use<'_> {
        self.vars(group).filter(|&var| self.allowed[var as usize])
    }

    /// The variable of a choice, if it exists.
    pub(super) fn var(&self, choice: Choice) -> Option<u32> {
        let first = *self.first.get(choice.group as usize)?;
        let end = *self.first.get(choice.group as usize + 1)?;
        first.checked_add(choice.candidate).filter(|&var| var < end)
    }

    pub(super) fn choice(&self, var: u32) -> Choice {
        let group = self.group_of[var as usize];
        Choice { group, candidate: var - self.first[group as usize] }
    }

    /// Whether these are one existing candidate a group.
    pub(super) fn fits(&self, choices: &[u32]) -> bool {
        choices.len() == self.groups() as usize
            && (0u32..)
                .zip(choices)
                .all(|(group, &candidate)| self.var(Choice { group, candidate }).is_some())
    }
}

type Terms = Lists<(u32, i64)>;

/// Terms by row, and the same by variable.
fn both_ways(terms: &[Vec<(u32, i64)>], vars: usize) -> (Terms, Terms) {
    let by_row: Vec<_> = (0u32..)
        .zip(terms)
        .flat_map(|(row, terms)| terms.iter().map(move |&term| (row, term)))
        .collect();
    let by_var: Vec<_> = by_row.iter().map(|&(row, (var, delta))| (var, (row, delta))).collect();
    (Lists::collect(terms.len(), &by_row), Lists::collect(vars, &by_var))
}

type ClashLists = (Lists<u32>, Lists<(u32, i64)>);

fn clash_lists(model: &Model, first: &[u32], vars: usize) -> ClashLists {
    let var = |choice: Choice| first[choice.group as usize] + choice.candidate;
    let mut hard = Vec::new();
    let mut soft = Vec::new();
    for clash in &model.clashes {
        let (a, b) = (var(clash.a), var(clash.b));
        match clash.cost {
            Cost::Hard => hard.extend([(a, b), (b, a)]),
            Cost::Soft(0) => {}
            Cost::Soft(cost) => soft.extend([(a, (b, cost)), (b, (a, cost))]),
        }
    }
    hard.sort_unstable();
    hard.dedup();
    soft.sort_unstable();
    soft.dedup_by(|&mut (a, (b, cost)), (kept_a, (kept_b, total))| {
        let same = (a, b) == (*kept_a, *kept_b);
        *total += if same { cost } else { 0 };
        same
    });
    (Lists::collect(vars, &hard), Lists::collect(vars, &soft))
}

/// The model's rows, then those of its any-ofs with each distinct row only once: an overload that
/// lasts is described by windows that overlap, so most of their rows are shared.
struct RowTable {
    slack: Vec<i64>,
    terms: Vec<Vec<(u32, i64)>>,
    any_of_rows: Vec<(u32, u32)>,
}

impl RowTable {
    fn new(model: &Model, first: &[u32]) -> Self {
        let mut slack: Vec<i64> = model.rows.iter().map(|row| row.slack).collect();
        let mut terms: Vec<_> = model.rows.iter().map(|row| merged_terms(row, first)).collect();
        let mut loose: Vec<_> = (0u32..)
            .zip(&model.any_ofs)
            .flat_map(|(any_of, rows)| rows.rows.iter().map(move |row| (row, any_of)))
            .map(|(row, any_of)| (row.slack, merged_terms(row, first), any_of))
            .collect();
        loose.sort_unstable();
        let mut any_of_rows = Vec::new();
        let firm = slack.len();
        for (row_slack, row_terms, any_of) in loose {
            let known = slack.len() > firm
                && slack.last() == Some(&row_slack)
                && terms.last() == Some(&row_terms);
            if !known {
                slack.push(row_slack);
                terms.push(row_terms);
            }
            any_of_rows.push((slack.len() as u32 - 1, any_of));
        }
        any_of_rows.dedup();
        Self { slack, terms, any_of_rows }
    }
}

fn merged_terms(row: &Row, first: &[u32]) -> Vec<(u32, i64)> {
    let var = |choice: Choice| first[choice.group as usize] + choice.candidate;
    let mut terms: Vec<_> =
        row.terms.iter().map(|&(choice, delta)| (var(choice), i64::from(delta))).collect();
    terms.sort_unstable_by_key(|&(var, _)| var);
    terms.dedup_by(|&mut (var, delta), (kept, total)| {
        let same = var == *kept;
        *total += if same { delta } else { 0 };
        same
    });
    terms.retain(|&(_, delta)| delta != 0);
    terms
}

#[cfg(test)]
mod tests {
    use super::super::model::{AnyOf, Clash, Group, choice};
    use super::*;

    #[test]
    fn entries_add_up_and_shared_rows_are_stored_once() {
        let shared = Row { slack: -1, terms: vec![(choice(1, 1), -1)] };
        let doubled = Row {
            slack: 0,
            terms: vec![
                (choice(0, 1), 2),
                (choice(0, 1), -2),
                (choice(1, 1), 1),
                (choice(1, 1), 1),
            ],
        };
        let soft = |cost| Clash { a: choice(1, 1), b: choice(0, 1), cost: Cost::Soft(cost) };
        let model = Model {
            groups: vec![Group::of(&[0, 1]), Group::of(&[0, 1])],
            clashes: vec![soft(2), soft(3), soft(0)],
            rows: vec![doubled],
            any_ofs: vec![
                AnyOf { rows: vec![shared.clone(), shared.clone()] },
                AnyOf { rows: vec![shared] },
            ],
        };
        let index = Index::new(&model).unwrap();
        assert_eq!(index.soft[1], [(3, 5)]);
        assert_eq!(index.row_terms[0], [(3, 2)]);
        assert_eq!(index.slack, [0, -1]);
        assert_eq!((&index.any_of_rows[0], &index.any_of_rows[1]), (&[1u32][..], &[1u32][..]));
        assert_eq!(index.row_any_ofs[1], [0, 1]);
        assert!(index.fits(&[1, 0]) && !index.fits(&[2, 0]) && !index.fits(&[0]));
    }
}
