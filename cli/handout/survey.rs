//! A look over the whole range of a table: where the ideal formula is how far off, how uncertain factors are at most, and
//! what straight lines between printed values miss.

use crate::ranges::Range;
use crate::show::places;
use crate::tables::table::Table;

/// Places along an axis of a table with one, two or three axes.
const ALONG: [usize; 3] = [201, 33, 11];
/// Per cent below which the ideal formula counts as good.
const GOOD: f64 = 1.0;

/// An extreme of the error.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct End {
    /// Error in per cent of the full value; negative if the ideal formula gives too little.
    pub percent: f64,
    /// Where.
    pub at: Vec<f64>,
}

/// What there is to say; the lists are by quantity.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Survey {
    /// How many places were looked at.
    pub places: usize,
    /// Smallest and largest error.
    pub errors: Vec<[End; 2]>,
    /// Part of the places where the error is below one per cent.
    pub good: Vec<f64>,
    /// Largest standard uncertainty of the factor.
    pub uncertainty: Vec<f64>,
    /// What linear interpolation between printed values misses at most, in the middle of their cells.
    pub linear: Vec<f64>,
    /// The ends of the ranges.
    pub corners: Vec<Vec<f64>>,
}

/// All combinations of values, one from each list; the last list runs fastest.
fn combinations(lists: &[Vec<f64>]) -> Vec<Vec<f64>> {
    let mut all = vec![Vec::new()];
    for list in lists {
        all = all.iter().flat_map(|p: &Vec<f64>| list.iter().map(|v| [&p[..], &[*v]].concat())).collect();
    }
    all
}

impl Survey {
    /// Looks at a table that is printed over these ranges.
    pub fn new(table: &Table, ranges: &[Range]) -> Survey {
        let count = table.in_threes();
        let along = ALONG[ranges.len() - 1];
        let lists: Vec<Vec<f64>> = ranges.iter().map(|r| r.span.evenly(along)).collect();
        let all = combinations(&lists);
        let mut survey = Survey {
            places: all.len(),
            good: vec![0.0; count],
            uncertainty: vec![0.0; count],
            linear: vec![0.0; count],
            corners: combinations(&ranges.iter().map(|r| vec![r.span.from, r.span.to]).collect::<Vec<_>>()),
            ..Survey::default()
        };
        for at in &all {
            for (n, f) in table.factors(at).iter().enumerate() {
                let end = End { percent: f.error_percent(), at: at.clone() };
                if survey.errors.len() == n {
                    survey.errors.push([end.clone(), end.clone()]);
                }
                if end.percent.abs() < GOOD {
                    survey.good[n] += 1.0 / all.len() as f64;
                }
                let [low, high] = &mut survey.errors[n];
                if end.percent < low.percent {
                    *low = end;
                } else if end.percent > high.percent {
                    *high = end;
                }
                survey.uncertainty[n] = survey.uncertainty[n].max(f.factor.uncertainty());
            }
        }
        // The sums of equal parts miss 1 by rounding.
        survey.good.iter_mut().for_each(|g| *g = (*g * all.len() as f64).round() / all.len() as f64);
        survey.linear(table, ranges);
        survey
    }

    fn linear(&mut self, table: &Table, ranges: &[Range]) {
        let printed: Vec<Vec<f64>> = ranges.iter().map(Range::printed_values).collect();
        let counts: Vec<usize> = printed.iter().map(Vec::len).collect();
        let value = |at: &[f64]| table.factors(at).iter().map(|f| f.factor.value).collect::<Vec<f64>>();
        let nodes: Vec<Vec<f64>> = places(ranges).iter().map(|at| value(at)).collect();
        let number = |index: &[usize]| index.iter().zip(&counts).fold(0, |n, (i, c)| n * c + i);
        let cells: Vec<Vec<f64>> = counts.iter().map(|c| (0..c - 1).map(|n| n as f64).collect()).collect();
        for cell in combinations(&cells) {
            let cell: Vec<usize> = cell.iter().map(|v| *v as usize).collect();
            let middle: Vec<f64> =
                cell.iter().zip(&printed).map(|(i, values)| 0.5 * (values[*i] + values[i + 1])).collect();
            let ends = combinations(&vec![vec![0.0, 1.0]; cell.len()]);
            let exact = value(&middle);
            for (n, exact) in exact.iter().enumerate() {
                let sum: f64 = ends
                    .iter()
                    .map(|end| {
                        let corner: Vec<usize> = cell.iter().zip(end).map(|(i, e)| i + *e as usize).collect();
                        nodes[number(&corner)][n]
                    })
                    .sum();
                self.linear[n] = self.linear[n].max((sum / ends.len() as f64 - exact).abs());
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::{table, table_job};

    #[test]
    fn the_extremes_are_those_of_the_invented_fringe() {
        // Without tilt the factor of the force is 1 + 7 gap (in metres): 1.014 at 2 mm; the steepest narrow place is worst.
        let survey = Survey::new(&table(), &table_job().ranges);
        let [low, high] = &survey.errors[1];
        assert_eq!(high.at, [0.002, 0.0]);
        assert!((high.percent - 100.0 * (1.0 / 1.014 - 1.0)).abs() < 1e-9);
        assert_eq!(low.at, [0.002, 1f64.to_radians()]);
        assert_eq!((survey.places, survey.corners.len()), (33 * 33, 4));
        assert!(survey.uncertainty[1] > 2.9e-5 && survey.good[1] == 0.0);
        assert!(survey.linear[1] > 1e-4 && survey.linear[1] < 0.1);
    }
}
