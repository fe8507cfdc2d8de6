use super::*;

fn grid() -> Vec<f64> {
    (380..=780).map(f64::from).collect()
}

fn gaussian(nm: f64, peak_nm: f64, fwhm_nm: f64) -> f64 {
    (-4.0 * 2f64.ln() * ((nm - peak_nm) / fwhm_nm).powi(2)).exp()
}

fn emitter(peak_nm: f64, fwhm_nm: f64) -> Spectrum {
    let values: Vec<f64> = grid().iter().map(|nm| gaussian(*nm, peak_nm, fwhm_nm)).collect();
    let power: f64 = values.iter().sum();
    Spectrum::new(grid(), values.iter().map(|v| v / power).collect()).unwrap()
}

fn set() -> Vec<Spectrum> {
    [(452.0, 24.0), (490.0, 32.0), (528.0, 36.0), (560.0, 60.0), (595.0, 30.0), (625.0, 26.0), (655.0, 40.0)]
        .map(|(peak, fwhm)| emitter(peak, fwhm))
        .to_vec()
}

fn blend(emitters: &[Spectrum], shares: &[f64]) -> Vec<f64> {
    (0..401).map(|k| emitters.iter().zip(shares).map(|(e, s)| s * e.values()[k]).sum()).collect()
}

/// Normal deviates from a fixed congruential sequence (Box and Muller 1958).
struct Noise(u64);

impl Noise {
    fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        ((self.0 >> 11) as f64 + 0.5) / (1_u64 << 53) as f64
    }

    fn normal(&mut self) -> f64 {
        (-2.0 * self.uniform().ln()).sqrt() * (std::f64::consts::TAU * self.uniform()).cos()
    }
}

#[test]
fn known_shares_are_recovered_without_noise() {
    let emitters = set();
    for shares in [
        vec![0.12, 0.05, 0.2, 0.23, 0.15, 0.2, 0.05],
        vec![0.3, 0.0, 0.0, 0.4, 0.0, 0.3, 0.0],
        vec![0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 1.0],
    ] {
        let power: Vec<f64> = blend(&emitters, &shares).iter().map(|v| 37.0 * v).collect();
        let found = unmix(&Spectrum::new(grid(), power).unwrap(), &emitters, Freedom::default()).unwrap();
        for (f, s) in found.shares.iter().zip(&shares) {
            assert!((f - s).abs() < 1e-6, "{:?} for {shares:?}", found.shares);
        }
        assert!(found.unexplained < 1e-9 && found.residual_rms < 1e-9);
        assert!(found.doubts.is_empty(), "{:?}", found.doubts);
        assert!(found.shift_nm.is_none() && found.stretch.is_none());
    }
}

#[test]
fn the_stated_interval_holds_the_true_share_nineteen_times_in_twenty() {
    let emitters = set();
    let shares = [0.12, 0.06, 0.2, 0.22, 0.15, 0.2, 0.05];
    let clean = blend(&emitters, &shares);
    let peak = clean.iter().copied().fold(0.0, f64::max);
    let mut noise = Noise(20_240_601);
    let (mut inside, mut all) = (0_u32, 0_u32);
    for _ in 0..1500 {
        let noisy: Vec<f64> = clean.iter().map(|v| v + 0.004 * peak * noise.normal()).collect();
        let found = unmix(&Spectrum::new(grid(), noisy).unwrap(), &emitters, Freedom::default()).unwrap();
        for (i, share) in shares.iter().enumerate() {
            let sigma = found.share_sigma[i].unwrap();
            all += 1;
            // 1.966: two-sided 95 % of Student's t with about 390 degrees of freedom.
            inside += u32::from((found.shares[i] - share).abs() <= 1.966 * sigma);
        }
        assert!(found.doubts.is_empty(), "{:?}", found.doubts);
    }
    let coverage = f64::from(inside) / f64::from(all);
    assert!((0.93..=0.97).contains(&coverage), "{coverage}");
}

#[test]
fn the_interval_holds_when_the_emitters_may_move() {
    let emitters = vec![emitter(455.0, 25.0), emitter(530.0, 60.0), emitter(612.0, 80.0)];
    let shares = [0.171, 0.307, 0.522];
    let truth = [(0.8, 1.03), (-1.5, 0.97), (2.0, 1.05)];
    let clean: Vec<f64> = grid()
        .iter()
        .map(|nm| {
            [(455.0, 25.0), (530.0, 60.0), (612.0, 80.0)]
                .iter()
                .zip(truth)
                .zip(shares)
                .map(|(((peak, fwhm), (shift, stretch)), share)| {
                    share * gaussian(*nm, peak + shift, fwhm * stretch) / (fwhm * stretch)
                })
                .sum()
        })
        .collect();
    let peak = clean.iter().copied().fold(0.0, f64::max);
    let mut noise = Noise(7);
    let freedom = Freedom { shift: true, stretch: true };
    let (mut inside, mut all) = (0_u32, 0_u32);
    for _ in 0..400 {
        let noisy: Vec<f64> = clean.iter().map(|v| v + 0.005 * peak * noise.normal()).collect();
        let found = unmix(&Spectrum::new(grid(), noisy).unwrap(), &emitters, freedom).unwrap();
        for (i, share) in shares.iter().enumerate() {
            all += 1;
            inside += u32::from((found.shares[i] - share).abs() <= 1.966 * found.share_sigma[i].unwrap());
        }
    }
    let coverage = f64::from(inside) / f64::from(all);
    assert!((0.93..=0.97).contains(&coverage), "{coverage}");
    let found = unmix(&Spectrum::new(grid(), clean).unwrap(), &emitters, freedom).unwrap();
    for i in 0..3 {
        assert!((found.shares[i] - shares[i]).abs() < 2e-5, "{:?}", found.shares);
        assert!((found.shift_nm.as_ref().unwrap()[i] - truth[i].0).abs() < 1e-3, "{:?}", found.shift_nm);
        assert!((found.stretch.as_ref().unwrap()[i] - truth[i].1).abs() < 1e-4, "{:?}", found.stretch);
    }
}

#[test]
fn a_missing_emitter_is_noticed_where_it_shines() {
    let emitters = set();
    let shares = [0.12, 0.05, 0.2, 0.23, 0.15, 0.2, 0.05];
    let mut power = blend(&emitters, &shares);
    let stranger = emitter(700.0, 25.0);
    for (p, s) in power.iter_mut().zip(stranger.values()) {
        *p = 0.96 * *p + 0.04 * s;
    }
    let mut noise = Noise(3);
    let peak = power.iter().copied().fold(0.0, f64::max);
    for p in &mut power {
        *p += 0.002 * peak * noise.normal();
    }
    let found = unmix(&Spectrum::new(grid(), power).unwrap(), &emitters, Freedom::default()).unwrap();
    assert!((found.unexplained - 0.04).abs() < 0.012, "{}", found.unexplained);
    let noticed = found.doubts.iter().find_map(|d| match d {
        Doubt::MissingLight { near_nm, .. } => Some(*near_nm),
        _ => None,
    });
    assert!(noticed.is_some_and(|nm| (nm - 700.0).abs() < 10.0), "{:?}", found.doubts);
    assert!(found.residual_rms > 0.002);
}

#[test]
fn a_missing_emitter_between_the_others_is_noticed_too() {
    let all = set();
    let shares = [0.15, 0.1, 0.2, 0.2, 0.15, 0.15, 0.05];
    let power = blend(&all, &shares);
    let without_teal: Vec<Spectrum> =
        all.iter().enumerate().filter(|(i, _)| *i != 1).map(|(_, e)| e.clone()).collect();
    let found = unmix(&Spectrum::new(grid(), power).unwrap(), &without_teal, Freedom::default()).unwrap();
    assert!(
        found
            .doubts
            .iter()
            .any(|d| matches!(d, Doubt::MissingLight { near_nm, .. } if (470.0..510.0).contains(near_nm))),
        "{:?}",
        found.doubts
    );
}

#[test]
fn other_sampling_of_the_measurement_changes_nothing() {
    let emitters = set();
    let shares = [0.12, 0.05, 0.2, 0.23, 0.15, 0.2, 0.05];
    let clean = blend(&emitters, &shares);
    let keep = |k: &usize| k.is_multiple_of(5) && (20..=340).contains(k);
    let nm: Vec<f64> = (0..401).filter(keep).map(|k| grid()[k]).collect();
    let power: Vec<f64> = (0..401).filter(keep).map(|k| clean[k]).collect();
    let found = unmix(&Spectrum::new(nm, power).unwrap(), &emitters, Freedom::default()).unwrap();
    for (f, s) in found.shares.iter().zip(&shares) {
        assert!((f - s).abs() < 1e-6, "{:?}", found.shares);
    }
}

#[test]
fn twin_emitters_have_no_share_of_their_own() {
    let emitters = vec![emitter(455.0, 25.0), emitter(560.0, 90.0), emitter(560.0, 90.0)];
    let power = blend(&emitters, &[0.2, 0.5, 0.3]);
    let found = unmix(&Spectrum::new(grid(), power).unwrap(), &emitters, Freedom::default()).unwrap();
    assert!((found.shares[0] - 0.2).abs() < 1e-6);
    assert!((found.shares[1] + found.shares[2] - 0.8).abs() < 1e-6);
    assert!(found.doubts.iter().any(|d| matches!(d, Doubt::Alike { .. })), "{:?}", found.doubts);
}

#[test]
fn what_cannot_be_unmixed_is_an_error_with_a_sentence() {
    let white = emitter(560.0, 90.0);
    assert_eq!(unmix(&white, &[], Freedom::default()), Err(UnmixError::NoEmitters));
    let dark = Spectrum::new(grid(), vec![0.0; 401]).unwrap();
    assert_eq!(
        unmix(&white, &[white.clone(), dark.clone()], Freedom::default()),
        Err(UnmixError::DarkEmitter { emitter: 1 })
    );
    assert_eq!(unmix(&dark, std::slice::from_ref(&white), Freedom::default()), Err(UnmixError::NothingFound));
    let short = Spectrum::new(vec![500.0, 501.0], vec![1.0, 1.0]).unwrap();
    assert_eq!(
        unmix(&short, &set(), Freedom::default()),
        Err(UnmixError::TooFewSamples { needed: 8, found: 2 })
    );
}
