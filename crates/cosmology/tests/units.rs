//! The units, held to two facts of the trade (common practice, no source).

use oddwell_cosmology::{HUBBLE_DISTANCE, SECONDS_PER_YEAR, SPEED_OF_LIGHT};

/// Kilometres in a megaparsec: 648000/π astronomical units of 149,597,870.7 km (IAU 2012 resolution B2, IAU 2015
/// resolution B2), times a million.
const KILOMETRES_PER_MEGAPARSEC: f64 = 648_000.0 / std::f64::consts::PI * 149_597_870.7 * 1e6;

/// Common practice, no source: 50 Mpc is of order 10²¹ km.
#[test]
fn fifty_megaparsecs_are_of_order_ten_to_the_twenty_one_kilometres() {
    let kilometres: f64 = 50.0 * KILOMETRES_PER_MEGAPARSEC;
    assert_eq!(kilometres.log10().floor(), 21.0, "{kilometres:e}");
}

/// Common practice, no source: light takes of order 10⁸ years to cross 50 Mpc. Computed as this crate measures distances,
/// in units of c/H₀ with H₀ = 100 h km/s/Mpc (h = 1), so that a mix-up of km/s, Mpc and Mpc/h shows.
#[test]
fn light_crosses_fifty_megaparsecs_in_of_order_ten_to_the_eight_years() {
    let hubble_time = KILOMETRES_PER_MEGAPARSEC / 100.0 / SECONDS_PER_YEAR;
    let years: f64 = 50.0 / HUBBLE_DISTANCE * hubble_time;
    assert_eq!(years.log10().floor(), 8.0, "{years:e}");
    let directly = 50.0 * KILOMETRES_PER_MEGAPARSEC / SPEED_OF_LIGHT / SECONDS_PER_YEAR;
    assert!((years / directly - 1.0).abs() < 1e-14);
}
