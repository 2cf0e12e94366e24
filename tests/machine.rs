//! Induction motors against published examples, tables and independent calculation.

use fourwire::machine::*;

#[test]
fn design_b_rows_fit() {
    for poles in [2u32, 4] {
        for hp in [1.0, 5.0, 25.0, 100.0, 250.0] {
            let plate = Nameplate { frequency_hz: 60.0, hp: Some(hp), volts: Some(460.0), poles: Some(poles), ..Nameplate::default() };
            let mut ratings = plate.resolve().unwrap();
            if std::env::var("TIGHT").is_ok() { ratings.breakdown_torque.origin = Origin::Given; }
            let t = std::time::Instant::now();
            match fit(&ratings) {
                Ok(f) => {
                    println!("{hp} {poles} {:?} steps {}", t.elapsed(), f.steps);
                    for i in &f.items { print!("  {} {:.3} {:.3} {:+.1}% ", i.quantity, i.wanted, i.obtained, i.error_percent()); }
                    println!();
                }
                Err(e) => println!("{hp} {poles} {e:?}"),
            }
        }
    }
}
