//! Completing a nameplate, and telling what contradicts.

use super::nameplate::{Design, Nameplate, NameplateFault, Origin, Rated, Ratings};
use crate::catalog::motors;
use crate::units::{KILO, SQRT_3, WATTS_PER_HORSEPOWER};

/// Collected faults.
#[derive(Default)]
struct Faults(Vec<NameplateFault>);

impl Faults {
    fn add(&mut self, column: &'static str, message: impl Into<String>, mend: impl Into<String>) {
        self.0.push(NameplateFault { column, message: message.into(), mend: mend.into() });
    }

    /// A given value that must lie between two bounds.
    fn range(&mut self, column: &'static str, value: Option<f64>, from: f64, to: f64) {
        if let Some(v) = value
            && !(v > from && v <= to)
        {
            let mend = format!("give a value above {from} and up to {to}, or leave the cell blank");
            self.add(column, format!("{v} makes no sense here"), mend);
        }
    }
}

pub(super) fn resolve(plate: &Nameplate) -> Result<Ratings, Vec<NameplateFault>> {
    let mut faults = Faults::default();
    ranges(plate, &mut faults);
    let power = power(plate, &mut faults);
    if plate.volts.is_none() {
        faults.add("volts", "the rated voltage is missing", "give the line-to-line volts of the nameplate");
    }
    let (Some(volts), Some(shaft_w), true) = (plate.volts, power, faults.0.is_empty()) else {
        return Err(faults.0);
    };
    let hp = shaft_w.value / WATTS_PER_HORSEPOWER;
    let (design, design_origin) = design(plate);
    let Some((poles, poles_origin)) = poles(plate, &mut faults) else { return Err(faults.0) };
    let full = full_load(plate, design, poles, hp, volts, &shaft_w, &mut faults);
    let locked_rotor_amps = locked_rotor_amps(plate, design, hp, volts, &full.amps, &mut faults);
    let torques = torques(plate, design, hp, poles, &mut faults);
    let locked_rotor_pf = locked_rotor_pf(plate, hp, &full.pf);
    let ratings = Ratings {
        frequency_hz: plate.frequency_hz,
        volts,
        shaft_w,
        amps: full.amps,
        efficiency: full.efficiency,
        pf: full.pf,
        poles,
        poles_origin,
        slip: full.slip,
        locked_rotor_amps,
        locked_rotor_pf,
        locked_rotor_torque: torques.0,
        pull_up_torque: torques.1,
        breakdown_torque: torques.2,
        design,
        design_origin,
        inertia_kgm2: Rated::given(0.0),
    };
    standstill_power(&ratings, &mut faults);
    let inertia_kgm2 = inertia(plate, &ratings, hp);
    if faults.0.is_empty() { Ok(Ratings { inertia_kgm2, ..ratings }) } else { Err(faults.0) }
}

fn ranges(plate: &Nameplate, faults: &mut Faults) {
    faults.range("frequency_hz", Some(plate.frequency_hz), 10.0, 500.0);
    faults.range("hp", plate.hp, 0.0, 1e5);
    faults.range("kw", plate.shaft_w.map(|w| w / KILO), 0.0, 1e5);
    faults.range("volts", plate.volts, 0.0, 5e4);
    faults.range("amps", plate.amps, 0.0, 1e5);
    faults.range("efficiency_percent", plate.efficiency.map(|e| 100.0 * e), 10.0, 99.5);
    faults.range("pf", plate.pf, 0.1, 0.99);
    faults.range("rpm", plate.rpm, 0.0, 3e4);
    faults.range("locked_rotor_amps", plate.locked_rotor_amps, 0.0, 1e6);
    faults.range("locked_rotor_multiple", plate.locked_rotor_multiple, 1.0, 20.0);
    faults.range("locked_rotor_pf", plate.locked_rotor_pf, 0.02, 0.98);
    faults.range("locked_rotor_torque_percent", plate.locked_rotor_torque.map(|t| 100.0 * t), 5.0, 600.0);
    faults.range("pull_up_torque_percent", plate.pull_up_torque.map(|t| 100.0 * t), 5.0, 600.0);
    faults.range("breakdown_torque_percent", plate.breakdown_torque.map(|t| 100.0 * t), 100.0, 800.0);
    faults.range("inertia_kgm2", plate.inertia_kgm2, 0.0, 1e6);
    faults.range("inertia_h_s", plate.inertia_h_s, 0.0, 100.0);
    if let Some(p) = plate.poles
        && (p < 2 || p % 2 != 0 || p > 64)
    {
        faults.add("poles", format!("{p} poles cannot be"), "give an even number from 2 to 64");
    }
    if let Some(letter) = plate.code
        && motors::code_letter(letter).is_none()
    {
        let mend = "give a letter A to V of NEMA MG 1 10.37.2 (I, O and Q are not used)";
        faults.add("code", format!("`{letter}` is not a code letter"), mend);
    }
}

fn power(plate: &Nameplate, faults: &mut Faults) -> Option<Rated> {
    let from_hp = plate.hp.map(|hp| hp * WATTS_PER_HORSEPOWER);
    match (plate.shaft_w, from_hp) {
        (Some(w), Some(h)) if (w / h - 1.0).abs() > 0.04 => {
            let message =
                format!("{:.1} kW is not {:.1} hp ({:.1} kW)", w / KILO, h / WATTS_PER_HORSEPOWER, h / KILO);
            faults.add("hp", message, "keep the one that stands on the nameplate");
            None
        }
        (Some(w), _) => Some(Rated::given(w)),
        (None, Some(h)) => Some(Rated::derived(h, "horsepower of 745.7 W")),
        (None, None) => {
            let (Some(v), Some(i), Some(e), Some(p)) = (plate.volts, plate.amps, plate.efficiency, plate.pf)
            else {
                faults.add("hp", "the shaft power is missing", "give hp or kw of the nameplate");
                return None;
            };
            Some(Rated::derived(SQRT_3 * v * i * e * p, "volts, amperes, efficiency and power factor"))
        }
    }
}

fn design(plate: &Nameplate) -> (Design, Origin) {
    match plate.design {
        Some(d) => (d, Origin::Given),
        None if plate.frequency_hz > 55.0 => {
            (Design::B, Origin::Filled("common practice for 60 Hz, no source".to_string()))
        }
        None => (Design::N, Origin::Filled("common practice for 50 Hz, no source".to_string())),
    }
}

/// Poles from the speed: the most whose synchronous speed is above it.
fn poles(plate: &Nameplate, faults: &mut Faults) -> Option<(u32, Origin)> {
    let sync = |poles: u32| 120.0 * plate.frequency_hz / f64::from(poles);
    let Some(rpm) = plate.rpm else {
        let common = || Origin::Filled("common practice, no source".to_string());
        return Some(plate.poles.map_or_else(|| (4, common()), |p| (p, Origin::Given)));
    };
    let even = || (1..=32).map(|pair| 2 * pair);
    let hz = plate.frequency_hz;
    let found = plate.poles.or_else(|| even().rfind(|&p| sync(p) > rpm));
    let synchronous = even().find(|&p| (rpm / sync(p) - 1.0).abs() < 1e-4);
    let mend = "give the full-load speed of the nameplate, some percent below synchronous speed";
    match (found, synchronous) {
        (Some(p), None) if rpm < sync(p) && rpm > 0.7 * sync(p) => {
            let origin =
                if plate.poles.is_some() { Origin::Given } else { Origin::Derived("rpm".to_string()) };
            return Some((p, origin));
        }
        (_, Some(p)) => {
            faults.add("rpm", format!("{rpm} rpm is the synchronous speed of {p} poles at {hz} Hz"), mend);
        }
        (Some(p), None) => {
            let slip = 100.0 * (1.0 - rpm / sync(p));
            faults.add(
                "rpm",
                format!("{rpm} rpm would be a slip of {slip:.1} % with {p} poles at {hz} Hz"),
                mend,
            );
        }
        (None, None) => {
            faults.add("rpm", format!("{rpm} rpm is above every synchronous speed at {hz} Hz"), mend);
        }
    }
    None
}

struct FullLoad {
    amps: Rated,
    efficiency: Rated,
    pf: Rated,
    slip: Rated,
}

fn full_load(
    plate: &Nameplate,
    design: Design,
    poles: u32,
    hp: f64,
    volts: f64,
    shaft: &Rated,
    faults: &mut Faults,
) -> FullLoad {
    let given_slip = plate.rpm.map(|rpm| 1.0 - rpm * f64::from(poles) / (120.0 * plate.frequency_hz));
    let apparent = plate.amps.map(|i| SQRT_3 * volts * i);
    let efficiency = match (plate.efficiency, apparent, plate.pf) {
        (Some(e), _, _) => Rated::given(e),
        (None, Some(va), Some(pf)) => Rated::derived(shaft.value / (va * pf), "power, volts, amperes and pf"),
        _ => filled_efficiency(hp, given_slip, design),
    };
    let pf = match (plate.pf, apparent) {
        (Some(p), _) => Rated::given(p),
        (None, Some(va)) => {
            Rated::derived(shaft.value / (va * efficiency.value), "power, volts, amperes and efficiency")
        }
        (None, None) => match motors::full_load_pf(hp) {
            Some(row) => Rated::filled(row.value, row.source),
            None => Rated::filled(0.85, "common practice, no source"),
        },
    };
    let needed = shaft.value / (SQRT_3 * volts * efficiency.value * pf.value);
    let amps = plate.amps.map_or_else(
        || {
            if pf.is_filled() || efficiency.is_filled() {
                Rated::filled(needed, "power over volts, with the efficiency and power factor filled in")
            } else {
                Rated::derived(needed, "power, volts, efficiency and power factor")
            }
        },
        Rated::given,
    );
    let slip = match given_slip {
        Some(s) => Rated::derived(s, "full-load and synchronous speed"),
        None => filled_slip(hp, efficiency.value, design),
    };
    check_full_load(
        &FullLoad { amps: amps.clone(), efficiency: efficiency.clone(), pf: pf.clone(), slip: slip.clone() },
        needed,
        faults,
    );
    FullLoad { amps, efficiency, pf, slip }
}

/// Efficiency of the table, no better than a high given slip allows.
fn filled_efficiency(hp: f64, slip: Option<f64>, design: Design) -> Rated {
    let row = motors::full_load_efficiency(hp);
    let (value, source) =
        row.map_or((0.9, "common practice, no source".to_string()), |r| (r.value, r.source));
    let most = 0.96 * (1.0 - slip.unwrap_or(if design == Design::D { 0.08 } else { 0.0 }));
    if value > most {
        return Rated::filled(most, format!("{source}, lowered to what the slip allows"));
    }
    Rated::filled(value, source)
}

/// Slip by common practice: 3.5 % at 1 hp falling as the fourth root of power; 8 % for design D.
fn filled_slip(hp: f64, efficiency: f64, design: Design) -> Rated {
    if design == Design::D {
        return Rated::filled(0.08, "NEMA MG 10 Table 2-1, within 5 to 13 % of design D");
    }
    let value = (0.035 * hp.powf(-0.25)).min(0.45 * (1.0 - efficiency)).clamp(0.003, 0.05);
    Rated::filled(value, "common practice (0.035 hp^-1/4), no source")
}

fn check_full_load(full: &FullLoad, needed: f64, faults: &mut Faults) {
    let FullLoad { amps, efficiency, pf, slip } = full;
    if !(efficiency.value > 0.1 && efficiency.value < 1.0) {
        let message = format!(
            "{:.1} A at this power and power factor would need an efficiency of {:.1} %",
            amps.value,
            100.0 * efficiency.value
        );
        faults.add("amps", message, "check amps, volts, pf and power; one of them is wrong");
    } else if !(pf.value > 0.1 && pf.value < 1.0) {
        let message = format!(
            "{:.1} A at this power and efficiency would need a power factor of {:.2}",
            amps.value, pf.value
        );
        faults.add("amps", message, "check amps, volts, efficiency_percent and power; one of them is wrong");
    } else if (needed / amps.value - 1.0).abs() > 0.06 {
        let message = format!(
            "power, volts, efficiency and power factor make {needed:.1} A, the nameplate says {:.1} A",
            amps.value
        );
        faults.add("amps", message, "check the four values; leave blank the one you trust least");
    }
    if efficiency.value >= 1.0 - slip.value && !slip.is_filled() {
        let message = format!(
            "an efficiency of {:.1} % cannot be at a slip of {:.2} %, which alone loses as much in the rotor",
            100.0 * efficiency.value,
            100.0 * slip.value
        );
        faults.add("rpm", message, "check rpm and efficiency_percent");
    }
}

fn locked_rotor_amps(
    plate: &Nameplate,
    design: Design,
    hp: f64,
    volts: f64,
    full_load: &Rated,
    faults: &mut Faults,
) -> Rated {
    let of_code = |kva_per_hp: f64| kva_per_hp * KILO * hp / (SQRT_3 * volts);
    let code = plate.code.and_then(motors::code_letter);
    let from_multiple = plate.locked_rotor_multiple.map(|m| m * full_load.value);
    let stated = match (plate.locked_rotor_amps, from_multiple) {
        (Some(a), Some(m)) if (a / m - 1.0).abs() > 0.08 => {
            let message = format!("{a:.0} A is not the stated multiple of full-load current ({m:.0} A)");
            faults.add("locked_rotor_amps", message, "keep the one that stands on the nameplate");
            Some(Rated::given(a))
        }
        (Some(a), _) => Some(Rated::given(a)),
        (None, Some(m)) => Some(Rated::derived(m, "multiple of full-load current")),
        (None, None) => None,
    };
    if let (Some(amps), Some(range)) = (&stated, &code) {
        let per_hp = SQRT_3 * volts * amps.value / KILO / hp;
        if per_hp < 0.9 * range.from || range.to.is_some_and(|to| per_hp > 1.1 * to) {
            let to = range.to.map_or("more".to_string(), |t| t.to_string());
            let message = format!(
                "{:.0} A is {per_hp:.1} kVA a horsepower, the code letter stands for {} to {to}",
                amps.value, range.from
            );
            faults.add("code", message, "check the code letter, volts and locked-rotor amperes");
        }
    }
    let found = stated.unwrap_or_else(|| match (code, design) {
        (Some(c), _) => {
            Rated::derived(of_code(c.middle()), &format!("middle of the code letter ({})", c.source))
        }
        (None, Design::N | Design::H) => Rated::filled(
            6.0 * full_load.value,
            "about 6 times full load, IEEE Std 399-1997 9.5.2 (from memory)",
        ),
        (None, _) => match motors::locked_rotor_amps(hp, volts) {
            Some(row) if design == Design::A => {
                Rated::filled(row.value, format!("{} (design A has no limit and may draw more)", row.source))
            }
            Some(row) => Rated::filled(row.value, row.source),
            None => Rated::filled(6.0 * full_load.value, "about 6 times full load, IEEE Std 399-1997 9.5.2"),
        },
    });
    if found.value < 1.2 * full_load.value {
        let message = format!(
            "{:.1} A at standstill is not well above {:.1} A at full load",
            found.value, full_load.value
        );
        faults.add(
            "locked_rotor_amps",
            message,
            "check amps, volts and the locked-rotor value or code letter",
        );
    }
    found
}

fn locked_rotor_pf(plate: &Nameplate, hp: f64, full_load_pf: &Rated) -> Rated {
    match (plate.locked_rotor_pf, motors::locked_rotor_pf(hp)) {
        (Some(pf), _) => Rated::given(pf),
        (None, Some(row)) => Rated::filled(row.value, row.source),
        (None, None) => {
            Rated::filled(0.2f64.min(full_load_pf.value), "IEEE Std 399-1997 9.5.2 (from memory)")
        }
    }
}

/// Locked-rotor, pull-up and breakdown torque.
fn torques(
    plate: &Nameplate,
    design: Design,
    hp: f64,
    poles: u32,
    faults: &mut Faults,
) -> (Rated, Option<Rated>, Rated) {
    let lower_end = |locked: f64, most: f64, what: &str| {
        let source = format!("NEMA MG 10 Table 2-1, lower end of {what}");
        (Rated::filled(locked, source.clone()), None, Rated::filled(most, source))
    };
    let table = match design {
        Design::C => lower_end(2.0, 2.0, "design C, breakdown raised to locked-rotor torque"),
        Design::H => lower_end(2.0, 2.0, "design C, which IEC design H is close to"),
        Design::D => lower_end(2.75, 2.75, "design D"),
        Design::A | Design::B | Design::N => match motors::design_b_torques(hp, poles) {
            Some(t) => {
                let note = if design == Design::N { " (design N is close to it)" } else { "" };
                let of = |v: motors::TableValue| Rated::filled(v.value, format!("{}{note}", v.source));
                (of(t.locked_rotor), Some(of(t.pull_up)), of(t.breakdown))
            }
            None => lower_end(0.7, 1.75, "design B"),
        },
    };
    let (given_locked, given_most) = (plate.locked_rotor_torque, plate.breakdown_torque);
    let mut locked = given_locked.map_or(table.0, Rated::given);
    let mut most = given_most.map_or(table.2, Rated::given);
    let pull_up = plate.pull_up_torque.map(Rated::given).or(table.1);
    if locked.value > most.value * 1.001 {
        match (given_locked, given_most) {
            (Some(l), Some(m)) => {
                let message = format!(
                    "breakdown torque {:.0} % is below locked-rotor torque {:.0} %",
                    100.0 * m,
                    100.0 * l
                );
                faults.add(
                    "breakdown_torque_percent",
                    message,
                    "breakdown torque is the greatest of the whole curve; check both",
                );
            }
            (Some(l), None) => most = Rated::filled(l, "raised to the given locked-rotor torque"),
            _ => {
                locked = Rated::filled(0.95 * most.value, "lowered to stay below the given breakdown torque")
            }
        }
    }
    if let (Some(p), Some(l)) = (plate.pull_up_torque, given_locked.or(given_most))
        && p > 1.001 * l
    {
        let message = format!("pull-up torque {:.0} % is above {:.0} %", 100.0 * p, 100.0 * l);
        faults.add(
            "pull_up_torque_percent",
            message,
            "pull-up torque is the least of the curve; check the three torques",
        );
    }
    (locked, pull_up, most)
}

/// At standstill all that crosses the air gap comes from the terminals.
fn standstill_power(ratings: &Ratings, faults: &mut Faults) {
    let apparent = SQRT_3 * ratings.volts * ratings.locked_rotor_amps.value;
    let gap = ratings.locked_rotor_torque.value * ratings.torque_nm() * ratings.sync_rad_s();
    let least_pf = gap / apparent;
    let pf = &ratings.locked_rotor_pf;
    if least_pf > 0.95 || (least_pf > pf.value && !pf.is_filled()) {
        let message = format!(
            "{:.0} % torque at standstill takes {:.1} kW across the air gap, but {:.0} A at power factor {:.2} bring only {:.1} kW",
            100.0 * ratings.locked_rotor_torque.value,
            gap / KILO,
            ratings.locked_rotor_amps.value,
            pf.value,
            apparent * pf.value / KILO
        );
        let mend = "check locked-rotor torque, current and power factor; leave blank the one you trust least";
        faults.add("locked_rotor_torque_percent", message, mend);
    }
}

/// Rotor inertia: `0.02 x 2^(poles/2) x hp^(1.35 - 0.05 poles/2)` pound-feet squared where not given.
fn inertia(plate: &Nameplate, ratings: &Ratings, hp: f64) -> Rated {
    const KILOGRAM_SQUARE_METRES: f64 = 0.042_140_110_1;
    if let Some(j) = plate.inertia_kgm2 {
        return Rated::given(j);
    }
    if let Some(h) = plate.inertia_h_s {
        let apparent = SQRT_3 * ratings.volts * ratings.amps.value;
        let value = 2.0 * h * apparent / ratings.sync_rad_s().powi(2);
        return Rated::derived(value, "inertia constant and rated volt-amperes");
    }
    let pairs = f64::from(ratings.poles) / 2.0;
    let wk2 = 0.02 * pairs.exp2() * hp.powf((1.35 - 0.05 * pairs).max(0.95));
    Rated::filled(wk2 * KILOGRAM_SQUARE_METRES, "rotor inertia by the formula of NEMA MG 1 (from memory)")
}
