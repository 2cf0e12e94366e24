//! `fourwire line`.

use serde_json::json;

use super::args::{ConduitWord, KindWord, Line, LineFormat, PerWord};
use super::lengths::{Fault, parse_length, parse_spacing};
use super::{Outcome, Screen};
use crate::catalog::{Catalog, Conductor, ConduitKind, Family, IecMethod, iec_rating_amps, nec_rating_amps};
use crate::impedance::{Computed, Conditions, EPSILON_0, Kind, NEUTRAL, Recipe, Spacing, evaluate};
use crate::import::read_folder;
use crate::output::{
    construction_text, diagnostics_text, drop_text, json_rows, matrix_rows, rows_csv, sizes_text, wires_text,
};
use crate::study::construction::{ConstructionReport, Per, reduce_neutral, sequence_means};
use crate::study::line::{Candidate, Case, Circuit, Wire, drop, sizes};

/// What the command works on: the wires, the site, and the construction asked for.
struct Asked {
    catalog: Catalog,
    conditions: Conditions,
    name: String,
    recipe: Recipe,
    slots: Vec<usize>,
    /// False for a wire alone, without geometry: its resistance is all that is known.
    placed: bool,
}

/// Lists wires, lays a construction open, and does the desk calculation.
pub(super) fn line(options: &Line, screen: &mut Screen) -> Outcome {
    match run(options, screen) {
        Ok(()) => Outcome::Done,
        Err(faults) => {
            for (message, cure) in faults {
                screen.tell(&format!("error: {message}\n  = help: {cure}\n"));
            }
            Outcome::WrongInput
        }
    }
}

fn run(options: &Line, screen: &mut Screen) -> Result<(), Vec<Fault>> {
    if let Some(text) = &options.list {
        return list(options, text, screen);
    }
    let asked = ask(options, screen)?;
    let mut pages = Pages::new(options.format);
    let computed = if asked.placed { Some(compute(&asked)?) } else { None };
    if let Some(computed) = &computed {
        let report = ConstructionReport::new(&asked.name, computed, &asked.slots, per(options.per));
        pages.add("construction", json!(report), || construction_text(&report), || matrix_rows(&report));
    }
    if let Some(case) = case(options)? {
        desk(options, &asked, computed.as_ref(), &case, &mut pages)?;
    } else if computed.is_none() {
        return Err(vec![(
            "a wire alone has no matrix".to_string(),
            "give --spacing (or --conduit), or --amps, --length and --volts for the desk calculation"
                .to_string(),
        )]);
    }
    screen.print(&pages.finish());
    Ok(())
}

/// Text pages one after the other, one JSON object, or the last table as CSV.
struct Pages {
    format: LineFormat,
    text: String,
    object: serde_json::Map<String, serde_json::Value>,
    table: String,
}

impl Pages {
    fn new(format: LineFormat) -> Pages {
        Pages { format, text: String::new(), object: serde_json::Map::new(), table: String::new() }
    }

    /// Adds a result: its JSON, its page, and its rows with a header.
    fn add(
        &mut self,
        name: &str,
        value: serde_json::Value,
        text: impl FnOnce() -> String,
        rows: impl FnOnce() -> Vec<Vec<String>>,
    ) {
        match self.format {
            LineFormat::Text => self.text.push_str(&text()),
            LineFormat::Csv => self.table = rows_csv(&rows()),
            LineFormat::Json => {
                self.object.insert(name.to_string(), value);
            }
        }
    }

    fn finish(self) -> String {
        match self.format {
            LineFormat::Text => self.text,
            LineFormat::Csv => self.table,
            LineFormat::Json => format!("{:#}\n", serde_json::Value::Object(self.object)),
        }
    }
}

fn list(options: &Line, text: &str, screen: &mut Screen) -> Result<(), Vec<Fault>> {
    let catalog = match &options.folder {
        Some(folder) => read_folder(folder).catalog,
        None => Catalog::built_in().clone(),
    };
    let wires = catalog.search(text);
    if wires.is_empty() {
        let cure = "try a size such as 4/0, 336.4 or 95 mm2, a metal, or ACSR".to_string();
        return Err(vec![(format!("no wire of the table fits {text:?}"), cure)]);
    }
    let (temperature, frequency) = (options.temperature.unwrap_or(50.0), options.frequency);
    let mut pages = Pages::new(options.format);
    let rows: Vec<_> = wires
        .iter()
        .map(|w| {
            json!({
                "wire": w.name, "material": w.material.word(), "area_mm2": w.area_m2.map(|a| a * 1e6),
                "r_ohm_per_km": w.ohm_per_m(temperature, frequency).map(|r| r * 1e3), "r_at_c": temperature,
                "diameter_mm": w.diameter_m.map(|d| d * 1e3), "gmr_mm": w.gmr_m.map(|g| g * 1e3),
                "rating_a": w.rating_amps, "source": w.source, "provenance": w.provenance,
            })
        })
        .collect();
    let header = [
        "wire",
        "material",
        "area_mm2",
        "r_ohm_per_km",
        "r_at_c",
        "diameter_mm",
        "gmr_mm",
        "rating_a",
        "source",
        "provenance",
    ];
    let table = || json_rows(&header, &rows);
    pages.add("wires", json!(rows), || wires_text(&wires, temperature, frequency), table);
    screen.print(&pages.finish());
    Ok(())
}

fn per(word: PerWord) -> Per {
    match word {
        PerWord::Km => Per::Kilometre,
        PerWord::Mi => Per::Mile,
        PerWord::Kft => Per::Kilofoot,
    }
}

fn ask(options: &Line, screen: &mut Screen) -> Result<Asked, Vec<Fault>> {
    match (&options.construction, &options.folder) {
        (Some(name), Some(folder)) => from_folder(options, name, folder, screen),
        (Some(_), None) => Err(vec![(
            "--construction needs the folder it stands in".into(),
            "add the network's folder".into(),
        )]),
        (None, _) => by_hand(options),
    }
}

fn from_folder(
    options: &Line,
    name: &str,
    folder: &std::path::Path,
    screen: &mut Screen,
) -> Result<Asked, Vec<Fault>> {
    let reading = read_folder(folder);
    if reading.diagnostics.has_errors() {
        screen.tell(&diagnostics_text(&reading.diagnostics, screen.colour_on_stderr()));
        return Err(vec![(
            "the folder has faults".into(),
            "mend them first; `fourwire check` shows all".into(),
        )]);
    }
    let Some(described) = reading.described.iter().find(|d| &*d.name == name) else {
        let known: Vec<String> = reading.described.iter().map(|d| d.name.to_string()).collect();
        let cure = match known.as_slice() {
            [] => {
                "constructions.csv describes none; those of matrices.csv are given, not computed".to_string()
            }
            _ => format!("it describes {}", known.join(", ")),
        };
        return Err(vec![(format!("constructions.csv has no construction {name:?}"), cure)]);
    };
    let study = &reading.draft.study;
    let used =
        reading.draft.lines.iter().find(|l| &*l.construction == name).map(|l| l.conductors.to_string());
    let letters = options.phases.clone().or(used).unwrap_or_else(|| "abc".to_string());
    Ok(Asked {
        conditions: Conditions {
            frequency_hz: study.frequency_hz,
            earth_resistivity_ohm_m: study.earth_resistivity_ohm_m,
            permittivity_f_per_m: EPSILON_0,
        },
        name: format!("Construction {name}"),
        recipe: described.recipe.clone(),
        slots: slots(&letters)?,
        placed: true,
        catalog: reading.catalog,
    })
}

fn by_hand(options: &Line) -> Result<Asked, Vec<Fault>> {
    let Some(phase) = &options.phase else {
        let cure =
            "give --list, --construction ID FOLDER, or --phase WIRE; `fourwire line --help` shows examples";
        return Err(vec![("nothing is asked".into(), cure.into())]);
    };
    let places = match &options.spacing {
        Some(text) => parse_spacing(text).map_err(|fault| vec![fault])?,
        None => Vec::new(),
    };
    let kind = match options.kind {
        Some(KindWord::Overhead) => Kind::Overhead,
        Some(KindWord::Concentric) => Kind::Concentric,
        Some(KindWord::Tape) => Kind::Tape,
        Some(KindWord::Conduit) => Kind::Conduit,
        Some(KindWord::Bundle) => Kind::Bundle,
        None if options.conduit.is_some() => Kind::Conduit,
        None => Kind::Overhead,
    };
    let conduit = match options.conduit {
        Some(ConduitWord::Aluminium) => ConduitKind::Aluminium,
        Some(ConduitWord::Steel) => ConduitKind::Steel,
        Some(ConduitWord::Pvc) | None => ConduitKind::Pvc,
    };
    let slots = match (&options.phases, places.is_empty()) {
        (Some(letters), _) => slots(letters)?,
        (None, false) => {
            let mut from_places: Vec<usize> = places.iter().map(|(s, _)| *s).collect();
            from_places.sort_unstable();
            from_places
        }
        (None, true) if kind == Kind::Conduit && options.neutral.is_none() => vec![0, 1, 2],
        (None, true) if kind == Kind::Conduit => vec![0, 1, 2, NEUTRAL],
        (None, true) => vec![0],
    };
    let placed = !places.is_empty() || matches!(kind, Kind::Conduit | Kind::Concentric | Kind::Tape);
    let recipe = Recipe {
        kind,
        phase: phase.clone(),
        neutral: options.neutral.clone(),
        spacing: (!places.is_empty()).then(|| Spacing { name: "--spacing".into(), places }),
        conduit,
        sequence: None,
        temperature_c: options.temperature.unwrap_or(if kind == Kind::Conduit { 75.0 } else { 50.0 }),
    };
    let conditions = Conditions {
        frequency_hz: options.frequency,
        earth_resistivity_ohm_m: options.earth,
        permittivity_f_per_m: EPSILON_0,
    };
    Ok(Asked { catalog: Catalog::built_in().clone(), conditions, name: phase.clone(), recipe, slots, placed })
}

/// Slots of conductor letters such as `abcn`.
fn slots(letters: &str) -> Result<Vec<usize>, Vec<Fault>> {
    let mut slots = Vec::new();
    for letter in letters.trim().to_lowercase().chars() {
        match "abcn".find(letter) {
            Some(slot) if !slots.contains(&slot) => slots.push(slot),
            _ => {
                return Err(vec![(
                    format!("{letters:?} is no set of conductors"),
                    "write letters such as abcn or an".into(),
                )]);
            }
        }
    }
    slots.sort_unstable();
    if slots.iter().all(|&s| s == NEUTRAL) {
        return Err(vec![("no phase is named".into(), "name at least one of a, b, c".into())]);
    }
    Ok(slots)
}

fn compute(asked: &Asked) -> Result<Computed, Vec<Fault>> {
    compute_with(asked, &asked.recipe)
}

fn compute_with(asked: &Asked, recipe: &Recipe) -> Result<Computed, Vec<Fault>> {
    let phases: Vec<usize> = asked.slots.iter().copied().filter(|&s| s != NEUTRAL).collect();
    let neutral = asked.slots.contains(&NEUTRAL);
    evaluate(recipe, &asked.catalog, &phases, neutral, &asked.conditions)
        .map_err(|faults| faults.into_iter().map(|f| (f.to_string(), f.cure())).collect())
}

/// The circuit of the desk calculation, where one is asked for.
fn case(options: &Line) -> Result<Option<Case>, Vec<Fault>> {
    let (amps, length, volts) = match (options.amps, &options.length, options.volts) {
        (None, None, _) => return Ok(None),
        (Some(amps), Some(length), Some(volts)) => (amps, length, volts),
        _ => {
            let cure = "give all of --amps, --length (with its unit, such as 150ft or 60m) and --volts";
            return Err(vec![(
                "the desk calculation needs a current, a length and a voltage".into(),
                cure.into(),
            )]);
        }
    };
    let length_m = parse_length(length).map_err(|fault| vec![fault])?;
    let positive = [("--amps", amps), ("--volts", volts), ("--length", length_m)];
    let mut faults: Vec<Fault> = positive
        .iter()
        .filter(|(_, v)| !(v.is_finite() && *v > 0.0))
        .map(|(name, v)| (format!("{name} is {v}"), "give a number above zero".to_string()))
        .collect();
    if !(options.pf > 0.0 && options.pf <= 1.0) {
        faults.push((format!("--pf is {}", options.pf), "give a power factor above 0 and up to 1".into()));
    }
    if !faults.is_empty() {
        return Err(faults);
    }
    Ok(Some(Case { circuit: options.circuit.into(), volts, amps, pf: options.pf, length_m }))
}

fn desk(
    options: &Line,
    asked: &Asked,
    computed: Option<&Computed>,
    case: &Case,
    pages: &mut Pages,
) -> Result<(), Vec<Fault>> {
    let wire = match computed {
        Some(computed) => wire_of(computed, &asked.slots, case.circuit),
        None => resistance_only(asked, &asked.recipe.phase)?,
    };
    let result = drop(case, &wire);
    if result.percent >= 100.0 && options.limit.is_none() {
        let message = format!(
            "the drop would be {:.0} % of {} V: that current cannot flow over that length",
            result.percent, case.volts
        );
        return Err(vec![(
            message,
            "check --length and its unit, --amps and --volts, or choose a larger wire".into(),
        )]);
    }
    let note = if computed.is_none() && case.circuit != Circuit::Dc {
        "Reactance left out: without --spacing or --conduit only the wire's resistance is known.\n\n"
    } else {
        ""
    };
    let value = json!({ "case": case, "wire": wire, "result": result });
    let row = json!({
        "volts": case.volts, "amps": case.amps, "length_m": case.length_m, "drop_v": result.volts,
        "drop_exact_v": result.exact_volts, "drop_percent": result.percent, "loss_w": result.loss_watts,
    });
    let page = || {
        // Beyond all the voltage there is only the table of sizes to look at.
        if result.percent >= 100.0 {
            String::new()
        } else {
            format!("{}{note}", drop_text(case, &wire, &result))
        }
    };
    pages.add("drop", value, page, || {
        json_rows(&["volts", "amps", "length_m", "drop_v", "drop_exact_v", "drop_percent", "loss_w"], &[row])
    });
    if let Some(limit) = options.limit {
        let candidates = candidates(options, asked, computed.is_some(), case.circuit);
        let judged = sizes(case, &candidates, limit, options.price);
        let basis = rating_basis(options, &candidates, asked);
        let rows: Vec<_> = judged.rows.iter().map(|r| json!(r)).collect();
        pages.add(
            "sizes",
            json!(judged),
            || format!("{}{basis}", sizes_text(&judged)),
            || {
                json_rows(
                    &["size", "drop_percent", "loss_watts", "rating_amps", "loss_cost_per_year", "refused"],
                    &rows,
                )
            },
        );
    }
    Ok(())
}

/// Impedance of one wire: positive sequence for three phases, else half of the loop out and back.
fn wire_of(computed: &Computed, slots: &[usize], circuit: Circuit) -> Wire {
    let z = &computed.z_per_m;
    let phases: Vec<usize> = slots.iter().copied().filter(|&s| s != NEUTRAL).collect();
    let one = match (circuit, phases.as_slice()) {
        (Circuit::Three, [_, _, _]) => {
            let reduced = if slots.contains(&NEUTRAL) { reduce_neutral(z) } else { *z };
            sequence_means(&reduced).0
        }
        (_, [p, ..]) if slots.contains(&NEUTRAL) => {
            (z[(*p, *p)] + z[(NEUTRAL, NEUTRAL)] - 2.0 * z[(*p, NEUTRAL)]) / 2.0
        }
        (_, [p, q, ..]) => (z[(*p, *p)] + z[(*q, *q)] - 2.0 * z[(*p, *q)]) / 2.0,
        (_, [p]) => z[(*p, *p)] / 2.0,
        (_, []) => z[(0, 0)],
    };
    Wire { r_ohm_per_m: one.re, x_ohm_per_m: one.im }
}

fn resistance_only(asked: &Asked, name: &str) -> Result<Wire, Vec<Fault>> {
    let wire = asked.catalog.find(name).map_err(|f| vec![(f.to_string(), f.cure())])?;
    let r = wire.ohm_per_m(asked.recipe.temperature_c, asked.conditions.frequency_hz);
    let r_ohm_per_m = r.ok_or_else(|| {
        vec![(format!("the resistance of {} is not known", wire.name), "choose another".into())]
    })?;
    Ok(Wire { r_ohm_per_m, x_ohm_per_m: 0.0 })
}

/// The wire asked for: in conduit, building wire before others.
fn model(asked: &Asked) -> Option<&Conductor> {
    let phase = &asked.recipe.phase;
    match asked.recipe.kind {
        Kind::Conduit => asked.catalog.find_building(phase).ok(),
        _ => asked.catalog.find(phase).ok(),
    }
}

/// Sizes of the same family and metal as the wire asked for, each computed as that one is.
fn candidates(options: &Line, asked: &Asked, placed: bool, circuit: Circuit) -> Vec<Candidate> {
    let Some(model) = model(asked).cloned() else { return Vec::new() };
    let mut alike: Vec<Conductor> = asked
        .catalog
        .search("")
        .into_iter()
        .filter(|w| w.family == model.family && w.material == model.material)
        .filter(|w| !w.name.contains("solid") || model.name.contains("solid"))
        .cloned()
        .collect();
    alike.sort_by(|a, b| a.area_m2.unwrap_or(0.0).total_cmp(&b.area_m2.unwrap_or(0.0)));
    let of = |wire: Conductor| {
        let impedance = if placed {
            let neutral = asked.recipe.neutral.as_ref().map(|_| wire.name.clone());
            let recipe = Recipe { phase: wire.name.clone(), neutral, ..asked.recipe.clone() };
            wire_of(&compute_with(asked, &recipe).ok()?, &asked.slots, circuit)
        } else {
            resistance_only(asked, &wire.name).ok()?
        };
        Some(Candidate { rating_amps: rating(options, &wire), name: wire.name, wire: impedance })
    };
    alike.into_iter().filter_map(of).collect()
}

/// Rating of a wire as it is used: building wire at 75 C (NEC), an IEC size in PVC clipped direct, both for
/// the ambient and grouping asked for; a bare wire's as the table has it.
fn rating(options: &Line, wire: &Conductor) -> Option<f64> {
    match wire.family {
        Family::Building => {
            let size = wire.name.split_whitespace().next()?;
            nec_rating_amps(size, wire.material, 75, options.ambient, 3 * options.grouped)
        }
        Family::Iec => {
            let mm2 = (wire.area_m2? * 1e8).round() / 100.0;
            iec_rating_amps(mm2, wire.material, 70, IecMethod::C, options.ambient, options.grouped)
        }
        _ => wire.rating_amps,
    }
}

/// What the ratings in the table of sizes stand for.
fn rating_basis(options: &Line, candidates: &[Candidate], asked: &Asked) -> String {
    let family = model(asked).map(|w| w.family);
    let place = format!("{} C ambient, circuits grouped: {}", options.ambient, options.grouped);
    match family {
        _ if candidates.is_empty() => String::new(),
        Some(Family::Building) => format!("Ratings: NEC Table 310.16, 75 C, {place}.\n"),
        Some(Family::Iec) => format!(
            "Ratings: IEC 60364-5-52, PVC 70 C, method C, {place};\ncheck them against the standard in force.\n"
        ),
        _ => "Ratings: as in the table of bare wires, in still air of its source.\n".to_string(),
    }
}
