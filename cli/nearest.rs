//! The known word nearest to a mistyped one.
//!
//! Distance is the number of single-letter slips: a letter too many, one missing, one wrong, or two neighbours
//! exchanged (optimal string alignment \[Damerau1964\]).

/// Number of slips between two words. Cost: product of the lengths.
pub fn slips(a: &str, b: &str) -> usize {
    let [a, b] = [a, b].map(|w| w.chars().flat_map(char::to_lowercase).collect::<Vec<char>>());
    // Rows i-2, i-1 and i of the table of distances between the first i letters of a and the first j of b.
    let mut rows = [vec![0; b.len() + 1], (0..=b.len()).collect::<Vec<usize>>(), vec![0; b.len() + 1]];
    for i in 1..=a.len() {
        rows[2][0] = i;
        for j in 1..=b.len() {
            let wrong = usize::from(a[i - 1] != b[j - 1]);
            let mut least = (rows[1][j] + 1).min(rows[2][j - 1] + 1).min(rows[1][j - 1] + wrong);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                least = least.min(rows[0][j - 2] + 1);
            }
            rows[2][j] = least;
        }
        rows.rotate_left(1);
    }
    rows[1][b.len()]
}

/// Shortest part of a known word that names it.
const PART: usize = 3;

/// The nearest of the known words: one that has the word as a part before those that are near by slips; of equally near
/// ones the first. None if there are no words.
pub fn nearest<'a>(word: &str, known: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let is_part = |k: &str| word.chars().count() >= PART && k.contains(&word.to_lowercase());
    known.into_iter().min_by_key(|k| (!is_part(k), slips(word, k)))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn slips_are_counted() {
        for (a, b, n) in [
            ("gap", "gap", 0),
            ("Gap", "gap", 0),
            ("", "gap", 3),
            ("gpa", "gap", 1),
            ("gab", "gap", 1),
            ("gaps", "gap", 1),
            ("titl", "tilt", 1),
            ("lenght", "length", 1),
            ("hieght", "height", 1),
            ("tilt", "title", 2),
        ] {
            assert_eq!(slips(a, b), n, "{a} {b}");
        }
    }

    #[test]
    fn the_nearest_word_is_found() {
        let known = ["gap", "tilt", "roll", "shift"];
        assert_eq!(nearest("titl", known), Some("tilt"));
        assert_eq!(nearest("shfit", known), Some("shift"));
        assert_eq!(nearest("x", known), Some("gap"));
        assert_eq!(nearest("x", []), None);
    }

    proptest! {
        #[test]
        fn a_distance(a in "[a-d]{0,6}", b in "[a-d]{0,6}") {
            prop_assert_eq!(slips(&a, &b), slips(&b, &a));
            prop_assert_eq!(slips(&a, &b) == 0, a == b);
            prop_assert!(slips(&a, &b) <= a.len().max(b.len()));
        }
    }
}
