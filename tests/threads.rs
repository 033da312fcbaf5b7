//! One, two and four threads give the same bits.

use tiltgap_meshes::{Arrangement, Dimensions, Plate, Pose};
use tiltgap_solver::{assess, Connection, Params, Question};

#[test]
fn results_do_not_depend_on_the_number_of_threads() {
    let plate = Plate { length_m: 0.12, width_m: 0.1, thickness_m: 0.0 };
    for roll_rad in [0.0, 0.003] {
        let question = Question {
            arrangement: Arrangement::open(
                plate,
                plate,
                Pose { gap_m: 0.004, tilt_rad: 0.01, roll_rad, shift_m: [0.001, 0.0] },
                Dimensions::Three,
            ),
            hinge: None,
            connection: Connection::Grounded,
            voltage_v: 250.0,
            relative_permittivity: 1.0006,
        };
        let run = |threads: usize| {
            let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
            let params = Params { accuracy: 3e-4, ..Params::default() };
            let a = pool.install(|| assess(&question, &params, &mut |_| {})).unwrap();
            let numbers =
                [a.force_n.to_vec(), a.torque_centre_nm.to_vec(), a.capacitance_matrix_f.concat()].concat();
            numbers.iter().flat_map(|e| [e.value.to_bits(), e.uncertainty.to_bits()]).collect::<Vec<u64>>()
        };
        let one = run(1);
        assert_eq!(one, run(2));
        assert_eq!(one, run(4));
    }
}
