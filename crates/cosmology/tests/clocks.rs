//! The clock contrast against worked values.

use oddwell_cosmology::*;

#[test]
fn worked_values() {
    let background = Background::new(0.31, 0.0, -1.0, 0.0).unwrap();
    let power = LinearPower::new(&PowerShape::EisensteinHu, 0.31, 0.049, 0.68, 0.965, 0.81).unwrap();
    for (distance, redshift, expected) in
        [(50.0, 0.5, 1.281150e-5), (50.0, 0.0, 1.108758e-5), (34.0, 1.0, 1.000510e-5)]
    {
        let a = 1.0 / (1.0 + redshift);
        let growth = growth_states(&background, &|_| 1.0, &[a]).unwrap()[0].growth;
        let setting = ClockSetting { redshift, distance, damping: 0.5, reached: (0.01, 0.2) };
        let contrast = clock_contrast(&background, &power, &setting, &|_| 1.0, &|_| growth).unwrap();
        println!(
            "{:e} {:e} {} {}",
            contrast.ratio,
            contrast.ratio / expected - 1.0,
            contrast.share,
            contrast.seconds_per_year()
        );
        assert!((contrast.ratio / expected - 1.0).abs() < 1e-6);
    }
}
