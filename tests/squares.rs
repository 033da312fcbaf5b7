//! Correction factors of equal square plates, from narrow gaps to wide ones, in both wirings
//! (`reference-cases/squares.json`, with the published tables it stands beside).

use crate::cases::hold;

#[test]
fn factors_of_square_plates_from_narrow_to_wide_gaps() {
    assert!(hold("squares") >= 28);
}
