//! Correction factors of equal square plates, from narrow gaps to wide ones, in both wirings
//! (`reference-cases/squares.json`, with the published tables it stands beside).

use serde_json::json;
use tiltgap_solver::Connection;

use crate::cases::{family, name, number, plates, solve, DEFAULT};

#[test]
fn factors_of_square_plates_from_narrow_to_wide_gaps() {
    for case in family("squares") {
        let g = &case["geometry"];
        let plate = json!({ "length": g["length"], "width": g["width"], "thickness": 0.0 });
        let (gap, shift) = (&g["gap"], [0.0, 0.0]);
        let geometry = json!({ "lower": plate, "upper": plate, "gap": gap, "tilt_deg": 0.0, "roll_deg": 0.0, "shift": shift });
        let arrangement = plates(&json!({ "geometry": geometry }));
        if arrangement.pose.gap_m > 1.0 {
            continue; // wider than the plates: solved too, but it takes a minute
        }
        for (connection, suffix) in [(Connection::Floating, ""), (Connection::Grounded, "_grounded")] {
            let factors = solve(arrangement, connection, DEFAULT).unwrap().factors;
            for (what, factor, limit) in
                [("capacitance_factor", factors.capacitance, 1e-4), ("force_factor", factors.force, 2e-4)]
            {
                let (factor, key) = (factor.unwrap(), format!("{what}{suffix}"));
                let (reference, open) = (number(&case["value"][&key]), number(&case["uncertainty"][&key]));
                let off = (factor.value - reference).abs();
                let said = format!("{} {key}: {} for {reference}", name(&case), factor.value);
                assert!(off <= limit * reference, "{said}");
                assert!(
                    off <= 3.0 * factor.uncertainty.hypot(open),
                    "{said}, stated {:.1e}",
                    factor.uncertainty
                );
            }
        }
    }
}
