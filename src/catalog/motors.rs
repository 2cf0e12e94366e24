//! Published tables of induction motors: code letters, full-load and locked-rotor amperes, torques,
//! power factors, inertias, derating for unbalance.
//!
//! Every value comes with the source of its row. Between two rows of a table by horsepower the value is
//! interpolated, beyond its ends the end row is taken; both are said in the source.

use super::tables::{Cells, number, rows, text};

/// A value out of a table, with where it is published.
#[derive(Debug, Clone, PartialEq)]
pub struct TableValue {
    /// The value, in the unit that the function states.
    pub value: f64,
    /// Published source, with how the row was found where none fits exactly.
    pub source: String,
    /// `read` in the document, from `memory`, or `mixed`.
    pub provenance: String,
}

/// Range of locked-rotor kilovolt-amperes per horsepower of a NEMA code letter.
#[derive(Debug, Clone, PartialEq)]
pub struct CodeLetter {
    /// Lower end, kVA per horsepower.
    pub from: f64,
    /// Upper end; none for the last letter.
    pub to: Option<f64>,
    /// Published source.
    pub source: String,
}

impl CodeLetter {
    /// Middle of the range; of the last letter, which has no end, its beginning.
    pub fn middle(&self) -> f64 {
        self.to.map_or(self.from, |to| 0.5 * (self.from + to))
    }
}

/// Least torques of NEMA design B, parts of full-load torque.
#[derive(Debug, Clone, PartialEq)]
pub struct DesignTorques {
    /// At standstill.
    pub locked_rotor: TableValue,
    /// Least while accelerating.
    pub pull_up: TableValue,
    /// Greatest.
    pub breakdown: TableValue,
}

/// The NEMA MG 1 code letter (10.37.2), or none for a letter that is not in use.
pub fn code_letter(letter: char) -> Option<CodeLetter> {
    let wanted = letter.to_ascii_uppercase().to_string();
    let row = rows(include_str!("data/motor_code_letters.csv")).find(|c| text(c, "code").trim() == wanted)?;
    Some(CodeLetter {
        from: number(&row, "kva_per_hp_min")?,
        to: number(&row, "kva_per_hp_max"),
        source: text(&row, "source"),
    })
}

/// Full-load amperes of a three-phase motor, NFPA 70 Table 430.250; made for sizing wires, so above what most
/// motors draw. `volts` is the rated line-to-line voltage; between the printed voltages amperes go as 1/volts.
pub fn full_load_amps(hp: f64, volts: f64) -> Option<TableValue> {
    amps(
        include_str!("data/motor_fla_nec_430_250.csv"),
        "A",
        &[115, 200, 208, 230, 460, 575, 2300],
        hp,
        volts,
    )
}

/// Greatest locked-rotor amperes of NEMA designs B, C and D: NEMA MG 1 12.35.1, NFPA 70 Table 430.251(B).
///
/// `volts` is the rated line-to-line voltage; amperes are inversely proportional to it, as the standard says.
pub fn locked_rotor_amps(hp: f64, volts: f64) -> Option<TableValue> {
    let printed = [115, 200, 208, 230, 460, 575, 2300, 4000];
    amps(include_str!("data/motor_locked_rotor_design_B.csv"), "LRA", &printed, hp, volts)
}

/// Amperes out of the column of the nearest printed voltage that has the row, scaled by 1/volts.
fn amps(table: &'static str, prefix: &str, printed: &[u32], hp: f64, volts: f64) -> Option<TableValue> {
    if !(volts > 0.0 && volts.is_finite()) {
        return None;
    }
    let mut near: Vec<f64> = printed.iter().map(|&v| f64::from(v)).collect();
    near.sort_by(|a, b| (a / volts).ln().abs().total_cmp(&(b / volts).ln().abs()));
    let mut end_row = None;
    for column_volts in near {
        let column = format!("{prefix}_{column_volts:.0}V");
        // Kilovolt-amperes a horsepower change little from row to row: interpolate those.
        let per_hp = |c: &Cells| Some(number(c, &column)? / number(c, "hp")?);
        let Some((mut found, within)) = by_hp(rows(table), hp, per_hp) else { continue };
        found.value *= hp * column_volts / volts;
        if (column_volts - volts).abs() > 1e-6 * volts {
            found.source = format!("{}, column of {column_volts:.0} V scaled to {volts:.0} V", found.source);
        }
        if within {
            return Some(found);
        }
        end_row.get_or_insert(found);
    }
    end_row
}

/// Least locked-rotor, pull-up and breakdown torque of NEMA design B (MG 1 12.38 to 12.40), parts of
/// full-load torque, for 2, 4, 6 or 8 poles; more poles take the row of 8.
pub fn design_b_torques(hp: f64, poles: u32) -> Option<DesignTorques> {
    let speed = 7200.0 / f64::from(poles.clamp(2, 8));
    let of = |column: &str| {
        let table = rows(include_str!("data/motor_torques_design_B.csv"))
            .filter(|c| number(c, "sync_rpm_60Hz").is_some_and(|n| (n - speed).abs() < 1.0));
        by_hp(table, hp, |c| Some(number(c, column)? / 100.0)).map(|(value, _)| value)
    };
    Some(DesignTorques {
        locked_rotor: of("locked_rotor_torque_pct")?,
        pull_up: of("pull_up_torque_pct")?,
        breakdown: of("breakdown_torque_pct")?,
    })
}

/// Power factor at standstill, a fraction (generator-set application manual; common practice).
pub fn locked_rotor_pf(hp: f64) -> Option<TableValue> {
    let table = rows(include_str!("data/motor_locked_rotor_pf.csv"));
    by_hp(table, hp, |c| number(c, "locked_rotor_pf")).map(|(value, _)| value)
}

/// Full-load efficiency, a fraction: NEMA MG 1 Table 12-12, 4 poles.
pub fn full_load_efficiency(hp: f64) -> Option<TableValue> {
    let table = rows(include_str!("data/motor_efficiency_pf_typical.csv"));
    by_hp(table, hp, |c| Some(number(c, "full_load_efficiency_pct")? / 100.0)).map(|(value, _)| value)
}

/// Full-load power factor, typical of 4-pole catalogues (no standard; to 0.03 at best).
pub fn full_load_pf(hp: f64) -> Option<TableValue> {
    let table = rows(include_str!("data/motor_efficiency_pf_typical.csv"));
    by_hp(table, hp, |c| number(c, "full_load_pf_typical")).map(|(value, _)| value)
}

/// Greatest inertia of the driven load that a design A or B motor must bring to speed, kg m2: NEMA MG 1 12.54.
///
/// `None` where the table has no such motor.
pub fn greatest_load_inertia(hp: f64, poles: u32) -> Option<TableValue> {
    const KILOGRAM_SQUARE_METRES: f64 = 0.042_140_110_1;
    let column = format!("Wk2_{}rpm_lbft2", 7200u32.checked_div(poles)?);
    let table = rows(include_str!("data/motor_max_load_inertia.csv"));
    let (mut found, within) = by_hp(table, hp, |c| number(c, &column))?;
    found.value *= KILOGRAM_SQUARE_METRES;
    within.then_some(found)
}

/// Part of rated output that remains at a percent voltage unbalance (greatest deviation of a line voltage
/// from their mean): NEMA MG 1 Figure 14-1, straight between whole percents.
///
/// `None` above 5 percent, where the standard recommends no operation.
pub fn unbalance_derating(percent: f64) -> Option<TableValue> {
    let table = rows(include_str!("data/motor_misc.csv"));
    let points: Vec<(f64, f64, Cells)> = table
        .filter_map(|c| {
            let item = text(&c, "item");
            let at: f64 = item.strip_prefix("unbalance_derating_")?.strip_suffix("pct")?.parse().ok()?;
            let factor = text(&c, "value").split_whitespace().next()?.parse().ok()?;
            Some((at, factor, c))
        })
        .collect();
    let (first, last) = (points.first()?, points.last()?);
    if !(0.0..=last.0).contains(&percent) {
        return None;
    }
    let value = if percent <= first.0 {
        first.1
    } else {
        let pair = points.windows(2).find(|w| w.last().is_some_and(|p| percent <= p.0))?;
        let [low, high] = pair else { return None };
        low.1 + (high.1 - low.1) * (percent - low.0) / (high.0 - low.0)
    };
    Some(TableValue { value, source: text(&first.2, "source"), provenance: text(&first.2, "provenance") })
}

/// Value of a column by horsepower, and whether the table reaches that far.
fn by_hp(
    table: impl Iterator<Item = Cells>,
    hp: f64,
    value: impl Fn(&Cells) -> Option<f64>,
) -> Option<(TableValue, bool)> {
    if !(hp > 0.0 && hp.is_finite()) {
        return None;
    }
    let mut points: Vec<(f64, f64, Cells)> =
        table.filter_map(|c| Some((number(&c, "hp")?, value(&c)?, c))).collect();
    points.sort_by(|a, b| a.0.total_cmp(&b.0));
    let below = points.iter().rfind(|p| p.0 <= hp * (1.0 + 1e-6));
    let above = points.iter().find(|p| p.0 >= hp * (1.0 - 1e-6));
    let (value, row, how) = match (below, above) {
        (Some(low), Some(high)) if high.0 - low.0 > 1e-9 * hp => {
            let share = (hp - low.0) / (high.0 - low.0);
            (low.1 + (high.1 - low.1) * share, low, format!(", between {} and {} hp", low.0, high.0))
        }
        (Some(row), Some(_)) => (row.1, row, format!(", row of {} hp", row.0)),
        (Some(row), None) | (None, Some(row)) => {
            (row.1, row, format!(", row of {} hp, the nearest there is", row.0))
        }
        (None, None) => return None,
    };
    let found = TableValue {
        value,
        source: format!("{}{how}", text(&row.2, "source")),
        provenance: text(&row.2, "provenance"),
    };
    Some((found, below.is_some() && above.is_some()))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Every row of every motor table names its source and its provenance.
    #[test]
    fn every_row_has_a_source() {
        let tables = [
            include_str!("data/motor_code_letters.csv"),
            include_str!("data/motor_design_letters.csv"),
            include_str!("data/motor_efficiency_pf_typical.csv"),
            include_str!("data/motor_equivalent_circuits_ohm.csv"),
            include_str!("data/motor_equivalent_circuits_pu.csv"),
            include_str!("data/motor_fla_nec_430_250.csv"),
            include_str!("data/motor_locked_rotor_design_B.csv"),
            include_str!("data/motor_locked_rotor_pf.csv"),
            include_str!("data/motor_max_load_inertia.csv"),
            include_str!("data/motor_misc.csv"),
            include_str!("data/motor_starting_methods.csv"),
            include_str!("data/motor_torques_design_B.csv"),
        ];
        for table in tables {
            let mut count = 0;
            for row in rows(table) {
                assert!(!text(&row, "source").is_empty() && !text(&row, "provenance").is_empty(), "{row:?}");
                count += 1;
            }
            assert!(count >= 4);
        }
    }

    #[test]
    fn between_rows_and_beyond() {
        // 60 and 75 hp at 460 V: 435 and 543 A (NFPA 70 Table 430.251(B)).
        let between = locked_rotor_amps(67.0, 460.0).unwrap();
        assert!((435.0..543.0).contains(&between.value) && between.source.contains("between 60 and 75 hp"));
        let beyond = locked_rotor_amps(1000.0, 460.0).unwrap();
        assert!((beyond.value - 2.0 * 3625.0).abs() < 1e-6 && beyond.source.contains("nearest"));
        assert!(locked_rotor_amps(f64::NAN, 460.0).is_none() && locked_rotor_amps(10.0, 0.0).is_none());
        // 40 hp is not printed at 2300 V: a column that has it is scaled.
        let scaled = locked_rotor_amps(40.0, 2300.0).unwrap();
        assert!((scaled.value - 290.0 * 460.0 / 2300.0).abs() < 1.0, "{scaled:?}");
    }

    /// NEMA MG 1 Figure 14-1: 1.0 at 1 %, 0.95 at 2 %, 0.75 at 5 % (from memory).
    #[test]
    fn derating() {
        let at = |p: f64| unbalance_derating(p).map(|v| v.value);
        assert_eq!(
            (at(0.5), at(2.0), at(5.0), at(5.01), at(f64::NAN)),
            (Some(1.0), Some(0.95), Some(0.75), None, None)
        );
        assert!(at(1.5).is_some_and(|v| (v - 0.975).abs() < 1e-12));
    }
}
