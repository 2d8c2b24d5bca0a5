//! The clock contrast against worked values.

use oddwell_cosmology::*;

#[test]
fn worked_values() {
    let background = Background::new(0.31, 0.0, -1.0, 0.0).unwrap();
    let power = LinearPower::new(&PowerShape::EisensteinHu, 0.31, 0.049, 0.68, 0.965, 0.81).unwrap();
    for (distance, redshift, expected) in [
        (50.0, 0.5, 1.281150e-5),
        (50.0, 0.0, 1.108758e-5),
        (34.0, 1.0, 1.000510e-5),
    ] {
        let a = 1.0 / (1.0 + redshift);
        let growth = growth_states(&background, &|_| 1.0, &[a]).unwrap()[0].growth;
        let setting = ClockSetting {
            redshift,
            distance,
            damping: 0.5,
            reached: (0.01, 0.2),
        };
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
#[test]
fn dbg(){
    let background = Background::new(0.31, 0.0, -1.0, 0.0).unwrap();
    let power = LinearPower::new(&PowerShape::EisensteinHu, 0.31, 0.049, 0.68, 0.965, 0.81).unwrap();
    let t = oddwell_cosmology::transfer::EisensteinHu::new(0.31,0.049,0.68).unwrap();
    for k in [1e-3,0.01,0.1,1.0,10.0] { println!("{k} {} {}", power.power(k), t.transfer(k)); }
    println!("{}", growth_states(&background, &|_| 1.0, &[1.0/1.5]).unwrap()[0].growth);
}
#[test]
fn dbg2(){
    for x in [0.1,0.5,1.0,2.0,2.9,3.1,5.0] { println!("{x} {:?}", spherical_bessel_all(x)); }
    let r=composite(&[0.0,1.0,3.0],8); println!("{:e} {:e}", r.integrate(|x|x.powi(7))-3f64.powi(8)/8.0, r.integrate(|x|x.exp())-3f64.exp()+1.0);
}
#[test]
fn dbg3(){
    let t=std::time::Instant::now();
    for i in 0..1000 { std::hint::black_box(LinearPower::new(&PowerShape::EisensteinHu, 0.31+1e-6*i as f64, 0.049, 0.68, 0.965, 0.81).unwrap()); }
    println!("power new {:?}", t.elapsed()/1000);
    let power = LinearPower::new(&PowerShape::EisensteinHu, 0.31, 0.049, 0.68, 0.965, 0.81).unwrap();
    let k: Vec<f64> = oddwell_cosmology::quadrature::geometric(1e-4,10.0,1000); let mut out=vec![0.0;1001];
    let t=std::time::Instant::now();
    for _ in 0..1000 { power.tabulate(&k,&mut out).unwrap(); std::hint::black_box(&out); }
    println!("tabulate per k {:?}", t.elapsed()/1001/1000);
    let power = LinearPower::new(&PowerShape::EisensteinHuSmooth, 0.31, 0.049, 0.68, 0.965, 0.81).unwrap();
    let t=std::time::Instant::now();
    for _ in 0..1000 { power.tabulate(&k,&mut out).unwrap(); std::hint::black_box(&out); }
    println!("smooth per k {:?}", t.elapsed()/1001/1000);
    let b = Background::new(0.31, 0.0, -1.0, 0.0).unwrap();
    let t=std::time::Instant::now();
    for _ in 0..1000 { std::hint::black_box(growth_states(&b,&|_|1.0,&[0.5,0.6,0.7,0.75,0.8]).unwrap()); }
    println!("growth {:?}", t.elapsed()/1000);
    let b2 = Background::new(0.31, 0.01, -0.9, 0.1).unwrap();
    let t=std::time::Instant::now();
    for _ in 0..1000 { std::hint::black_box(growth_states(&b2,&|_|1.0,&[0.5,0.6,0.7,0.75,0.8]).unwrap()); }
    println!("growth w0wa {:?}", t.elapsed()/1000);
    let t=std::time::Instant::now();
    for _ in 0..1000 { std::hint::black_box(b2.epoch(0.7).unwrap()); }
    println!("epoch w0wa {:?}", t.elapsed()/1000);
    let t=std::time::Instant::now();
    for i in 0..100000 { std::hint::black_box(spherical_bessel_all(1e-4*i as f64)); }
    println!("bessel {:?}", t.elapsed()/100000);
    let t=std::time::Instant::now();
    for i in 0..100000 { std::hint::black_box(spherical_bessel_all(1e-4*(i+30000) as f64)); }
    println!("bessel high {:?}", t.elapsed()/100000);
    let setting = ClockSetting { redshift:0.5, distance:50.0, damping: 0.5, reached: (0.01, 0.2) };
    let t=std::time::Instant::now();
    for _ in 0..100 { std::hint::black_box(clock_contrast(&b2, &power, &setting, &|_| 1.0, &|_| 0.77).unwrap()); }
    println!("clock {:?}", t.elapsed()/100);
}
