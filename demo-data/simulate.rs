//! Makes the demo data: arrivals of goods lifts and restarts of cooling-water pumps.
//!
//! ```text
//! cargo run --release --example simulate -- demo-data
//! ```
//!
//! Both plants are invented. Each is a small physical model, stepped through time and read by
//! noisy sensors, so the traces of one kind differ as recordings do (load, speed, stiffness,
//! delays) and the kinds differ by what happens when, not by a level somebody added.
//!
//! The files come out the same, byte for byte, on every machine. That is why there is no `sin`,
//! `exp` or `ln` here, whose last digits depend on the platform's library: only the operations
//! IEEE 754 defines exactly (`+ - * /`, square root, absolute value, minimum, maximum, floor),
//! random numbers from an integer generator, and printing with fixed decimals.
//!
//! Reading order: [`random`], [`lift`], [`pump`], [`output`].
#![allow(
    clippy::print_stderr,
    unreachable_pub,
    reason = "a small program that says on standard error what went wrong"
)]

use std::path::Path;
use std::process::ExitCode;

const USAGE: &str = "\
usage: simulate OUTPUT_FOLDER
Writes lift-landings/ and pump-restarts/ below OUTPUT_FOLDER, replacing the CSV files of an
earlier run. Example: cargo run --release --example simulate -- demo-data";

fn main() -> ExitCode {
    let mut arguments = std::env::args_os().skip(1);
    let (Some(folder), None) = (arguments.next(), arguments.next()) else {
        eprintln!("{USAGE}");
        return ExitCode::from(2);
    };
    if folder.to_string_lossy().starts_with('-') {
        eprintln!("{USAGE}");
        return ExitCode::from(2);
    }
    match write_everything(Path::new(&folder)) {
        Ok(()) => ExitCode::SUCCESS,
        Err(message) => {
            eprintln!("error: {message}");
            ExitCode::FAILURE
        }
    }
}

/// Writes both data sets below a folder.
pub(crate) fn write_everything(folder: &Path) -> Result<(), String> {
    lift::write(&folder.join("lift-landings"))?;
    pump::write(&folder.join("pump-restarts"))
}

mod random {
    //! A seeded stream of random numbers made of integer operations alone.

    /// Draws further from the middle than this many spreads are pulled in, so that no trace
    /// becomes an outlier of its kind by chance.
    const WIDEST_DRAW: f64 = 2.0;

    /// A SplitMix64 stream.
    pub struct Random {
        state: u64,
    }

    impl Random {
        /// One stream per trace: changing how one trace is made leaves the others as they are.
        pub fn for_trace(seed: u64, number: u64) -> Self {
            let mut seeding = Random {
                state: seed ^ number.wrapping_mul(0xD134_2543_DE82_EF95),
            };
            Random {
                state: seeding.next(),
            }
        }

        fn next(&mut self) -> u64 {
            self.state = self.state.wrapping_add(0x9E37_79B9_7F4A_7C15);
            let mut z = self.state;
            z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
            z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
            z ^ (z >> 31)
        }

        /// Evenly spread over [0, 1). The 53 bits kept fit a double exactly.
        pub fn unit(&mut self) -> f64 {
            (self.next() >> 11) as f64 / 9_007_199_254_740_992.0
        }

        pub fn between(&mut self, low: f64, high: f64) -> f64 {
            low + (high - low) * self.unit()
        }

        /// A whole number from `low` to `high`, both included.
        pub fn whole(&mut self, low: usize, high: usize) -> usize {
            low + (self.unit() * (high - low + 1) as f64) as usize
        }

        /// Close to a normal draw of spread 1: twelve uniforms have variance 1 together. It
        /// needs no logarithm, which is the point.
        pub fn noise(&mut self) -> f64 {
            (0..12).map(|_| self.unit()).sum::<f64>() - 6.0
        }

        /// `middle`, give or take the share `spread` of it.
        pub fn around(&mut self, middle: f64, spread: f64) -> f64 {
            middle * (1.0 + spread * self.noise().clamp(-WIDEST_DRAW, WIDEST_DRAW))
        }

        pub fn shuffle<T>(&mut self, items: &mut [T]) {
            for last in (1..items.len()).rev() {
                items.swap(last, self.whole(0, last));
            }
        }
    }
}

mod lift {
    //! A goods lift arriving at a landing from below.
    //!
    //! The drive turns a drum along a speed profile; the car hangs on the drum by a rope with
    //! stiffness and damping; a brake holds the drum; doors open once the car has been quiet on
    //! the brake for a while. The five kinds are five causes in this one model, see
    //! [`Setup::draw`]. Positions are of the car floor relative to the landing, below negative.

    use super::output::{fixed, flag, make_folder, write_file};
    use super::random::Random;
    use std::f64::consts::TAU;
    use std::path::Path;

    const SEED: u64 = 0x4C49_4654;
    const STEP_S: f64 = 0.001;
    const STEPS_PER_SAMPLE: usize = 100;
    const SAMPLE_S: f64 = 0.1;

    const GRAVITY_M_S2: f64 = 9.81;
    const EMPTY_CAR_KG: f64 = 1400.0;
    const COUNTERWEIGHT_KG: f64 = 2300.0;
    const DRUM_INERTIA_KG: f64 = 900.0;
    const GUIDE_FRICTION_N: f64 = 350.0;
    /// How fast the drum follows the speed it is asked for.
    const DRIVE_LAG_S: f64 = 0.08;
    /// While it runs, the drive yields to the rope's pull by this speed per stretch. That damps
    /// the swings of the car; once the brake holds the drum, only the rope's own damping is left.
    const YIELD_PER_S: f64 = 6.0;
    const BRAKE_DECELERATION_MM_S2: f64 = 5000.0;

    const MAGNETISING_CURRENT_A: f64 = 6.0;
    const FORCE_PER_AMPERE_N: f64 = 520.0;
    const CURRENT_LAG_S: f64 = 0.06;

    /// The drum counts as level and standing within these.
    const LEVEL_MM: f64 = 0.4;
    const STANDING_MM_S: f64 = 1.0;
    /// Standing comes this much before the aim, so the control aims this much beyond level.
    const STOPS_SHORT_MM: f64 = 0.3;
    /// Beyond this on the brake, the control levels the car once more.
    const RELEVEL_BEYOND_MM: f64 = 20.0;
    /// Doors stay shut while the car is farther out or faster than this.
    const DOOR_ZONE_MM: f64 = 20.0;
    const DOOR_QUIET_MM_S: f64 = 30.0;

    const POSITION_NOISE_MM: f64 = 0.25;
    const SPEED_NOISE_MM_S: f64 = 1.0;
    const CURRENT_NOISE_A: f64 = 0.12;

    #[derive(Clone, Copy)]
    enum Kind {
        CleanStop,
        Overshoot,
        SlowCreep,
        RopeBounce,
        LateBrake,
    }

    const KINDS: [(Kind, &str, usize); 5] = [
        (Kind::CleanStop, "clean stop", 50),
        (Kind::Overshoot, "overshoot and re-level", 35),
        (Kind::SlowCreep, "slow creep", 30),
        (Kind::RopeBounce, "rope bounce", 25),
        (Kind::LateBrake, "late brake", 20),
    ];

    /// What one arrival is made of.
    struct Setup {
        samples: usize,
        start_mm: f64,
        approach_mm_s: f64,
        deceleration_mm_s2: f64,
        /// Speed asked for per distance left, close to the landing.
        levelling_per_s: f64,
        /// Where the control believes the landing to be.
        aim_mm: f64,
        /// The last stretch before the aim, which is driven at `zone_mm_s` at least.
        zone_mm: f64,
        zone_mm_s: f64,
        /// The brake falls this far before the aim even if the drum still turns; none: it waits
        /// for standstill.
        brake_ahead_mm: Option<f64>,
        brake_delay_s: f64,
        /// The drive's slip under load while it holds the car without the brake.
        drift_mm_s: f64,
        relevel_pause_s: f64,
        relevel_mm_s: f64,
        door_delay_s: f64,
        load_kg: f64,
        stiffness_n_m: f64,
        damping_n_s_m: f64,
    }

    impl Setup {
        /// Draws the lift and the load, then applies the cause that makes the kind.
        fn draw(kind: Kind, random: &mut Random) -> Setup {
            let mut setup = Setup::draw_clean_stop(random);
            match kind {
                Kind::CleanStop => {}
                // The level switch answers late, so the control aims beyond the landing.
                Kind::Overshoot => setup.aim_mm = random.around(46.0, 0.08),
                // The slowing switch sits too early: a long last stretch at levelling speed.
                Kind::SlowCreep => {
                    setup.zone_mm = random.around(128.0, 0.06);
                    setup.zone_mm_s = random.around(16.8, 0.05);
                }
                // Soft rope springs, and a brake that grabs while the drum still turns.
                Kind::RopeBounce => {
                    let hertz = random.around(1.05, 0.05);
                    let damping_ratio = random.around(0.042, 0.08);
                    setup.hang_car(hertz, damping_ratio);
                    let swing_mm = random.around(14.5, 0.09);
                    setup.zone_mm = random.around(75.0, 0.08);
                    setup.zone_mm_s = swing_mm * TAU * hertz;
                    setup.brake_ahead_mm = Some(random.between(0.8, 2.2));
                }
                // The brake valve sticks: the drive has to hold the car meanwhile.
                Kind::LateBrake => {
                    setup.brake_delay_s = random.around(2.3, 0.12);
                    let drift_mm = random.around(8.8, 0.07);
                    let upward = setup.car_kg() < COUNTERWEIGHT_KG;
                    let drift_mm_s = drift_mm / setup.brake_delay_s;
                    setup.drift_mm_s = if upward { drift_mm_s } else { -drift_mm_s };
                }
            }
            setup
        }

        fn draw_clean_stop(random: &mut Random) -> Setup {
            let approach_mm_s = random.around(330.0, 0.12);
            let deceleration_mm_s2 = random.around(175.0, 0.08);
            let run_s = random.around(1.1, 0.14);
            let slowing_mm = approach_mm_s * approach_mm_s / (2.0 * deceleration_mm_s2);
            let hertz = random.around(3.6, 0.08);
            let damping_ratio = random.around(0.22, 0.10);
            let mut setup = Setup {
                samples: random.whole(160, 190),
                start_mm: -(approach_mm_s * run_s + slowing_mm),
                approach_mm_s,
                deceleration_mm_s2,
                levelling_per_s: random.around(2.4, 0.07),
                aim_mm: random.between(STOPS_SHORT_MM - 0.15, STOPS_SHORT_MM + 0.15),
                zone_mm: 0.0,
                zone_mm_s: 0.0,
                brake_ahead_mm: None,
                brake_delay_s: random.around(0.35, 0.15),
                drift_mm_s: random.between(-0.4, 0.4),
                relevel_pause_s: random.around(1.6, 0.10),
                relevel_mm_s: random.around(17.0, 0.08),
                door_delay_s: random.around(1.4, 0.08),
                load_kg: random.between(200.0, 1900.0),
                stiffness_n_m: 0.0,
                damping_n_s_m: 0.0,
            };
            setup.hang_car(hertz, damping_ratio);
            setup
        }

        /// Chooses the rope that gives the loaded car this natural frequency and damping.
        fn hang_car(&mut self, hertz: f64, damping_ratio: f64) {
            let mass_kg = self.car_kg();
            let angular = TAU * hertz;
            self.stiffness_n_m = mass_kg * angular * angular;
            self.damping_n_s_m = 2.0 * damping_ratio * (self.stiffness_n_m * mass_kg).sqrt();
        }

        fn car_kg(&self) -> f64 {
            EMPTY_CAR_KG + self.load_kg
        }

        /// The speed profile: full speed, even deceleration, then speed in proportion to the
        /// distance left; inside the zone never below the zone's speed until the very end.
        fn speed_for(&self, position_mm: f64) -> f64 {
            let left_mm = self.aim_mm - position_mm;
            let to_zone_mm = (left_mm - self.zone_mm).max(0.0);
            let slowing = (2.0 * self.deceleration_mm_s2 * to_zone_mm).sqrt();
            let profile = self
                .approach_mm_s
                .min(slowing)
                .min(self.levelling_per_s * to_zone_mm);
            match self.brake_ahead_mm {
                Some(_) => profile.max(self.zone_mm_s),
                None => {
                    let limit = self.levelling_per_s * left_mm;
                    if self.zone_mm > 0.0 {
                        profile.max(self.zone_mm_s).min(limit)
                    } else {
                        profile.min(limit)
                    }
                }
            }
        }
    }

    /// What the control is doing, and since how long where that matters.
    #[derive(Clone, Copy)]
    enum Phase {
        Approach,
        Hold { for_s: f64 },
        Braked { for_s: f64 },
        Relevel,
    }

    struct Plant {
        phase: Phase,
        drum_mm: f64,
        drum_mm_s: f64,
        car_mm: f64,
        car_mm_s: f64,
        current_a: f64,
        quiet_s: f64,
        relevelled: bool,
        doors: bool,
    }

    impl Plant {
        fn at_start(setup: &Setup) -> Plant {
            Plant {
                phase: Phase::Approach,
                drum_mm: setup.start_mm,
                drum_mm_s: setup.approach_mm_s,
                car_mm: setup.start_mm,
                car_mm_s: setup.approach_mm_s,
                current_a: MAGNETISING_CURRENT_A,
                quiet_s: 0.0,
                relevelled: false,
                doors: false,
            }
        }

        fn brake(&self) -> bool {
            matches!(self.phase, Phase::Braked { .. })
        }

        fn step(&mut self, setup: &Setup) {
            self.phase = self.next_phase(setup);
            let drum_mm_s2 = self.drum_acceleration(setup);
            self.drum_mm_s += drum_mm_s2 * STEP_S;
            self.drum_mm += self.drum_mm_s * STEP_S;
            let car_mm_s2 = (setup.stiffness_n_m * (self.drum_mm - self.car_mm)
                + setup.damping_n_s_m * (self.drum_mm_s - self.car_mm_s))
                / setup.car_kg();
            self.car_mm_s += car_mm_s2 * STEP_S;
            self.car_mm += self.car_mm_s * STEP_S;
            self.follow_current(setup, drum_mm_s2, car_mm_s2);
            self.follow_doors(setup);
        }

        fn next_phase(&mut self, setup: &Setup) -> Phase {
            let standing = self.drum_mm_s.abs() < STANDING_MM_S;
            match self.phase {
                Phase::Approach => match setup.brake_ahead_mm {
                    Some(ahead_mm) if self.drum_mm >= setup.aim_mm - ahead_mm => {
                        Phase::Braked { for_s: 0.0 }
                    }
                    None if standing && (self.drum_mm - setup.aim_mm).abs() < LEVEL_MM => {
                        Phase::Hold { for_s: 0.0 }
                    }
                    _ => Phase::Approach,
                },
                Phase::Hold { for_s } if for_s >= setup.brake_delay_s => {
                    Phase::Braked { for_s: 0.0 }
                }
                Phase::Hold { for_s } => Phase::Hold {
                    for_s: for_s + STEP_S,
                },
                Phase::Braked { for_s }
                    if for_s >= setup.relevel_pause_s
                        && !self.relevelled
                        && self.drum_mm.abs() > RELEVEL_BEYOND_MM =>
                {
                    self.relevelled = true;
                    Phase::Relevel
                }
                Phase::Braked { for_s } => Phase::Braked {
                    for_s: for_s + STEP_S,
                },
                Phase::Relevel if standing && (self.drum_mm + STOPS_SHORT_MM).abs() < LEVEL_MM => {
                    Phase::Hold { for_s: 0.0 }
                }
                Phase::Relevel => Phase::Relevel,
            }
        }

        /// The drive is far stiffer than the rope: the drum goes as the control says, and what
        /// the rope pulls shows in the current.
        fn drum_acceleration(&self, setup: &Setup) -> f64 {
            let wanted_mm_s = match self.phase {
                Phase::Approach => setup.speed_for(self.drum_mm),
                Phase::Hold { .. } => setup.drift_mm_s,
                Phase::Relevel => (-setup.levelling_per_s * (self.drum_mm + STOPS_SHORT_MM))
                    .clamp(-setup.relevel_mm_s, setup.relevel_mm_s),
                Phase::Braked { .. } => {
                    let to_stop = -self.drum_mm_s / STEP_S;
                    return to_stop.clamp(-BRAKE_DECELERATION_MM_S2, BRAKE_DECELERATION_MM_S2);
                }
            };
            let yielding_mm_s = YIELD_PER_S * (self.drum_mm - self.car_mm);
            (wanted_mm_s - yielding_mm_s - self.drum_mm_s) / DRIVE_LAG_S
        }

        fn follow_current(&mut self, setup: &Setup, drum_mm_s2: f64, car_mm_s2: f64) {
            let wanted_a = if self.brake() {
                0.0
            } else {
                let weight_n = (setup.car_kg() - COUNTERWEIGHT_KG) * GRAVITY_M_S2;
                let inertia_n = (setup.car_kg() * car_mm_s2
                    + (DRUM_INERTIA_KG + COUNTERWEIGHT_KG) * drum_mm_s2)
                    / 1000.0;
                let friction_n = GUIDE_FRICTION_N * (self.car_mm_s / 20.0).clamp(-1.0, 1.0);
                let torque_a = (weight_n + inertia_n + friction_n) / FORCE_PER_AMPERE_N;
                (MAGNETISING_CURRENT_A * MAGNETISING_CURRENT_A + torque_a * torque_a).sqrt()
            };
            self.current_a += (wanted_a - self.current_a) * STEP_S / CURRENT_LAG_S;
        }

        fn follow_doors(&mut self, setup: &Setup) {
            let quiet = self.brake()
                && self.car_mm.abs() < DOOR_ZONE_MM
                && self.car_mm_s.abs() < DOOR_QUIET_MM_S;
            self.quiet_s = if quiet { self.quiet_s + STEP_S } else { 0.0 };
            self.doors |= self.quiet_s >= setup.door_delay_s;
        }
    }

    /// One trace as CSV.
    fn record(kind: Kind, random: &mut Random) -> String {
        let setup = Setup::draw(kind, random);
        let mut plant = Plant::at_start(&setup);
        let mut text = String::from(
            "time [s],position_error [mm],car_speed [mm/s],motor_current [A],brake,doors\n",
        );
        for sample in 0..setup.samples {
            let cells = [
                fixed(sample as f64 * SAMPLE_S, 1),
                fixed(plant.car_mm + POSITION_NOISE_MM * random.noise(), 1),
                fixed(plant.car_mm_s + SPEED_NOISE_MM_S * random.noise(), 1),
                fixed(
                    (plant.current_a + CURRENT_NOISE_A * random.noise()).max(0.0),
                    2,
                ),
                flag(plant.brake()),
                flag(plant.doors),
            ];
            text.push_str(&cells.join(","));
            text.push('\n');
            for _ in 0..STEPS_PER_SAMPLE {
                plant.step(&setup);
            }
        }
        text
    }

    /// Writes one file a trace, and the labels. Kinds are shuffled over the trace numbers so
    /// that the order of the files gives nothing away.
    pub fn write(folder: &Path) -> Result<(), String> {
        make_folder(folder)?;
        let mut order: Vec<(Kind, &str)> = Vec::new();
        for (kind, name, count) in KINDS {
            order.extend((0..count).map(|_| (kind, name)));
        }
        Random::for_trace(SEED, 0).shuffle(&mut order);
        let mut labels = String::from("trace,label\n");
        for (number, (kind, name)) in (1..).zip(order) {
            let trace = format!("L{number:03}");
            let text = record(kind, &mut Random::for_trace(SEED, number));
            write_file(&folder.join(format!("{trace}.csv")), &text)?;
            labels.push_str(&format!("{trace},{name}\n"));
        }
        write_file(&folder.join("labels.csv"), &labels)
    }
}

mod pump {
    //! A cooling-water pump that starts again after a stop and feeds a header under pressure.
    //!
    //! The rotor runs up, pressure builds against a closed discharge valve, the valve opens, and
    //! the water column in the pipe gets moving through a check valve. Gas in the casing takes
    //! away pump pressure; a check valve that shuts late on a flow turned back slams and rings
    //! the pipe. See [`Setup::draw`] for the kinds.

    use super::output::{fixed, flag, make_folder, write_file};
    use super::random::Random;
    use std::f64::consts::TAU;
    use std::path::Path;

    const SEED: u64 = 0x5055_4D50;
    const STEP_S: f64 = 0.005;
    const STEPS_PER_SAMPLE: usize = 100;
    const SAMPLE_S: f64 = 0.5;

    const PUMPS: usize = 12;

    /// Pump curve at full speed: pressure at no flow, and what flow takes away.
    const SHUT_OFF_BAR: f64 = 6.4;
    const CURVE_BAR_PER_L2: f64 = 0.000_16;
    /// Pipe friction, and how much pressure it takes to speed the water column up.
    const PIPE_BAR_PER_L2: f64 = 0.000_12;
    const COLUMN_BAR_S_PER_L: f64 = 0.035;
    /// Bar times litre per second is a tenth of a kilowatt.
    const KW_PER_BAR_L_S: f64 = 0.1;
    const EFFICIENCY: f64 = 0.72;
    const CHURNING_KW: f64 = 17.0;
    /// The narrowest opening a valve is reckoned with, to keep its loss finite.
    const LEAST_OPENING: f64 = 0.02;
    const VALVE_BAR_PER_L2: f64 = 0.000_03;
    /// Pressure step of the slam for each litre per second stopped.
    const SLAM_BAR_PER_L_S: f64 = 0.11;
    const COAST_S: f64 = 2.0;
    const GAS_SLUG_S: f64 = 1.2;

    const FLOW_NOISE_L_S: f64 = 0.35;
    const PRESSURE_NOISE_BAR: f64 = 0.02;
    const POWER_NOISE_KW: f64 = 0.25;

    #[derive(Clone, Copy)]
    enum Kind {
        Normal,
        SlowPriming,
        Surge,
        SecondStart,
        DryRun,
        StuckValve,
        LowSpeed,
    }

    const KINDS: [(Kind, usize); 7] = [
        (Kind::Normal, 44),
        (Kind::SlowPriming, 24),
        (Kind::Surge, 18),
        (Kind::SecondStart, 1),
        (Kind::DryRun, 1),
        (Kind::StuckValve, 1),
        (Kind::LowSpeed, 1),
    ];

    /// What one restart is made of.
    struct Setup {
        samples: usize,
        start_s: f64,
        run_up_s: f64,
        full_speed: f64,
        header_bar: f64,
        valve_wait_s: f64,
        valve_stroke_s: f64,
        valve_sticks: bool,
        /// How long it takes until the casing is full of water; never for a dry pump.
        priming_s: f64,
        /// How strongly gas slugs shake the pump pressure while priming.
        slug_share: f64,
        /// When a neighbouring pump pushes the header up, for how long and how far.
        pulse_at_s: f64,
        pulse_for_s: f64,
        pulse_bar: f64,
        /// How long the flow runs backwards before the check valve is shut.
        check_lag_s: f64,
        ring_hertz: f64,
        ring_damping: f64,
        /// The motor is off from the first of these times to the second.
        trip: Option<(f64, f64)>,
    }

    impl Setup {
        fn draw(kind: Kind, random: &mut Random) -> Setup {
            let mut setup = Setup::draw_normal(random);
            match kind {
                Kind::Normal => {}
                // A leaking foot valve let the casing drain during the stop.
                Kind::SlowPriming => {
                    setup.priming_s = random.around(18.5, 0.07);
                    setup.slug_share = random.around(0.42, 0.12);
                }
                // A neighbour switches on and turns the flow back for a moment; the check valve
                // is worn and shuts late.
                Kind::Surge => {
                    setup.pulse_bar = random.around(5.2, 0.05);
                    setup.pulse_for_s = random.around(3.2, 0.05);
                    setup.check_lag_s = random.around(0.38, 0.08);
                }
                Kind::SecondStart => {
                    setup.trip = Some((setup.start_s + 11.0, setup.start_s + 22.0))
                }
                Kind::DryRun => {
                    setup.priming_s = f64::INFINITY;
                    setup.slug_share = 0.3;
                    setup.trip = Some((setup.start_s + 32.0, f64::INFINITY));
                }
                Kind::StuckValve => setup.valve_sticks = true,
                Kind::LowSpeed => setup.full_speed = 0.80,
            }
            setup
        }

        fn draw_normal(random: &mut Random) -> Setup {
            let start_s = random.between(3.0, 5.0);
            Setup {
                samples: random.whole(80, 200),
                start_s,
                run_up_s: random.around(4.0, 0.10),
                full_speed: random.around(1.0, 0.008),
                header_bar: random.around(2.7, 0.03),
                valve_wait_s: random.around(2.2, 0.12),
                valve_stroke_s: random.around(5.0, 0.10),
                valve_sticks: false,
                priming_s: random.around(0.8, 0.15),
                slug_share: 0.0,
                pulse_at_s: start_s + random.around(10.5, 0.06),
                pulse_for_s: 0.0,
                pulse_bar: 0.0,
                check_lag_s: 0.03,
                ring_hertz: random.around(0.24, 0.05),
                ring_damping: random.around(0.075, 0.08),
                trip: None,
            }
        }

        fn running(&self, time_s: f64) -> bool {
            let tripped = self
                .trip
                .is_some_and(|(from, to)| time_s >= from && time_s < to);
            time_s >= self.start_s && !tripped
        }

        fn header(&self, time_s: f64) -> f64 {
            let since = time_s - self.pulse_at_s;
            if since >= 0.0 && since < self.pulse_for_s {
                self.header_bar + self.pulse_bar
            } else {
                self.header_bar
            }
        }
    }

    struct Plant {
        time_s: f64,
        running: bool,
        on_for_s: f64,
        speed: f64,
        primed: f64,
        slug: f64,
        opening: f64,
        flow_l_s: f64,
        back_for_s: f64,
        check_shut: bool,
        ring_bar: f64,
        ring_bar_s: f64,
    }

    impl Plant {
        fn at_rest() -> Plant {
            Plant {
                time_s: 0.0,
                running: false,
                on_for_s: 0.0,
                speed: 0.0,
                primed: 0.0,
                slug: 0.0,
                opening: 0.0,
                flow_l_s: 0.0,
                back_for_s: 0.0,
                check_shut: true,
                ring_bar: 0.0,
                ring_bar_s: 0.0,
            }
        }

        fn valve_open(&self) -> bool {
            self.opening > 0.95
        }

        fn step(&mut self, setup: &Setup, random: &mut Random) {
            self.running = setup.running(self.time_s);
            self.on_for_s = if self.running {
                self.on_for_s + STEP_S
            } else {
                0.0
            };
            self.step_rotor(setup);
            self.step_gas(setup, random);
            self.step_valve(setup);
            self.step_water(setup);
            self.step_ring(setup);
            self.time_s += STEP_S;
        }

        fn step_rotor(&mut self, setup: &Setup) {
            if self.running {
                let rise = setup.full_speed / setup.run_up_s * STEP_S;
                self.speed = (self.speed + rise).min(setup.full_speed);
            } else {
                self.speed -= self.speed * STEP_S / COAST_S;
            }
        }

        /// The share of water in the casing grows evenly; slugs are noise with a memory, strong
        /// while there is gas and gone when the casing is full.
        fn step_gas(&mut self, setup: &Setup, random: &mut Random) {
            if self.running {
                self.primed = (self.primed + STEP_S / setup.priming_s).min(1.0);
            }
            if setup.slug_share > 0.0 {
                let kick = random.noise() * (2.0 * STEP_S / GAS_SLUG_S).sqrt();
                self.slug += kick - self.slug * STEP_S / GAS_SLUG_S;
            }
        }

        fn step_valve(&mut self, setup: &Setup) {
            let wanted = if self.on_for_s > setup.valve_wait_s && !setup.valve_sticks {
                1.0
            } else {
                -1.0
            };
            self.opening = (self.opening + wanted * STEP_S / setup.valve_stroke_s).clamp(0.0, 1.0);
        }

        /// Pressure the pump makes. Gas takes most of it away: a casing half full gives little.
        fn pump_bar(&self, setup: &Setup) -> f64 {
            let filled = 0.12 + 0.88 * self.primed * self.primed;
            let gas = 4.0 * self.primed.min(1.0 - self.primed).clamp(0.0, 0.25);
            let shaken = (1.0 + setup.slug_share * gas * self.slug).clamp(0.0, 1.6);
            let shut_off = SHUT_OFF_BAR * self.speed * self.speed * filled * shaken;
            (shut_off - CURVE_BAR_PER_L2 * self.flow_l_s * self.flow_l_s.abs()).max(0.0)
        }

        fn step_water(&mut self, setup: &Setup) {
            let opening = self.opening.max(LEAST_OPENING);
            let loss = PIPE_BAR_PER_L2 + VALVE_BAR_PER_L2 / (opening * opening);
            let drive_bar = self.pump_bar(setup)
                - setup.header(self.time_s)
                - loss * self.flow_l_s * self.flow_l_s.abs();
            if (self.check_shut && drive_bar <= 0.0) || self.opening <= 0.0 {
                self.flow_l_s = 0.0;
                self.check_shut = true;
                return;
            }
            self.check_shut = false;
            self.flow_l_s += drive_bar / COLUMN_BAR_S_PER_L * STEP_S;
            self.back_for_s = if self.flow_l_s < 0.0 {
                self.back_for_s + STEP_S
            } else {
                0.0
            };
            if self.back_for_s >= setup.check_lag_s {
                self.slam(setup);
            }
        }

        /// The column stops against the shut valve: a pressure step that then swings out.
        fn slam(&mut self, setup: &Setup) {
            let angular = TAU * setup.ring_hertz;
            self.ring_bar_s += SLAM_BAR_PER_L_S * -self.flow_l_s * angular;
            self.flow_l_s = 0.0;
            self.back_for_s = 0.0;
            self.check_shut = true;
        }

        fn step_ring(&mut self, setup: &Setup) {
            let angular = TAU * setup.ring_hertz;
            let pull = angular * angular * self.ring_bar
                + 2.0 * setup.ring_damping * angular * self.ring_bar_s;
            self.ring_bar_s -= pull * STEP_S;
            self.ring_bar += self.ring_bar_s * STEP_S;
        }

        fn discharge_bar(&self, setup: &Setup) -> f64 {
            self.pump_bar(setup) + self.ring_bar
        }

        fn motor_kw(&self, setup: &Setup) -> f64 {
            let hydraulic =
                KW_PER_BAR_L_S * self.pump_bar(setup) * self.flow_l_s.max(0.0) / EFFICIENCY;
            let churning =
                CHURNING_KW * self.speed * self.speed * self.speed * (0.3 + 0.7 * self.primed);
            if self.running {
                hydraulic + churning
            } else {
                0.0
            }
        }
    }

    /// Adds the rows of one trace.
    fn record(trace: &str, kind: Kind, random: &mut Random, text: &mut String) {
        let setup = Setup::draw(kind, random);
        let mut plant = Plant::at_rest();
        for sample in 0..setup.samples {
            let cells = [
                trace.to_string(),
                fixed(sample as f64 * SAMPLE_S, 1),
                fixed(plant.flow_l_s + FLOW_NOISE_L_S * random.noise(), 1),
                fixed(
                    plant.discharge_bar(&setup) + PRESSURE_NOISE_BAR * random.noise(),
                    2,
                ),
                fixed(
                    (plant.motor_kw(&setup) + POWER_NOISE_KW * random.noise()).max(0.0),
                    1,
                ),
                flag(plant.running),
                flag(plant.valve_open()),
            ];
            text.push_str(&cells.join(","));
            text.push('\n');
            for _ in 0..STEPS_PER_SAMPLE {
                plant.step(&setup, random);
            }
        }
    }

    /// Writes all restarts as one long table, kinds shuffled. A trace is named by its pump and
    /// a running number, as a plant's log would.
    pub fn write(folder: &Path) -> Result<(), String> {
        make_folder(folder)?;
        let mut order: Vec<Kind> = Vec::new();
        for (kind, count) in KINDS {
            order.extend((0..count).map(|_| kind));
        }
        let mut naming = Random::for_trace(SEED, 0);
        naming.shuffle(&mut order);
        let mut text = String::from(
            "trace,time [s],flow [l/s],discharge_pressure [bar],motor_power [kW],running,valve_open\n",
        );
        let mut log_number = 2003;
        for (number, kind) in (1..).zip(order) {
            log_number += naming.whole(1, 9);
            let trace = format!("P{:02}-{log_number}", naming.whole(1, PUMPS));
            record(
                &trace,
                kind,
                &mut Random::for_trace(SEED, number),
                &mut text,
            );
        }
        write_file(&folder.join("pump-restarts.csv"), &text)
    }
}

mod output {
    //! Cells and files.

    use std::fs;
    use std::path::Path;

    /// A number with fixed decimals, rounded here so that a small negative number prints as
    /// `0.0` and not `-0.0`.
    pub fn fixed(value: f64, decimals: usize) -> String {
        let scale = if decimals == 1 { 10.0 } else { 100.0 };
        let rounded = (value * scale + 0.5).floor() / scale;
        format!("{rounded:.decimals$}")
    }

    pub fn flag(on: bool) -> String {
        String::from(if on { "1" } else { "0" })
    }

    pub fn make_folder(folder: &Path) -> Result<(), String> {
        fs::create_dir_all(folder)
            .map_err(|cause| format!("cannot make the folder {}: {cause}", folder.display()))
    }

    pub fn write_file(path: &Path, text: &str) -> Result<(), String> {
        fs::write(path, text).map_err(|cause| format!("cannot write {}: {cause}", path.display()))
    }
}
