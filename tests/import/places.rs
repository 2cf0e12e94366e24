//! File, line, spreadsheet row, column and cell of a fault, whatever stands above it.

use fourwire::diagnostic::Place;

use super::read_with;

/// The place of the only fault of this `loads.csv`, whose number `x` is wrong.
fn place(text: &str) -> Place {
    let reading = read_with(&[("loads.csv", text)]);
    let items = reading.diagnostics.items();
    assert_eq!(items.len(), 1, "{text:?}: {items:?}");
    items[0].place.clone().expect("a place")
}

#[test]
fn line_and_cell_of_a_fault() {
    let head = "load,node,phases,kw,pf";
    let good = "house,A,an,2,1";
    let bad = "shop,A,bn,x,1";
    for (name, text, line, cell) in [
        ("LF", format!("{head}\n{good}\n{bad}\n"), 3, "D3"),
        ("CRLF", format!("{head}\r\n{good}\r\n{bad}\r\n"), 3, "D3"),
        ("CR", format!("{head}\r{good}\r{bad}\r"), 3, "D3"),
        ("last line without end", format!("{head}\n{good}\n{bad}"), 3, "D3"),
        ("byte-order mark", format!("\u{feff}{head}\n{bad}\n"), 2, "D2"),
        ("comment above the header", format!("# one\n# two\n{head}\n{bad}\n"), 4, "D4"),
        ("comment between, CRLF", format!("{head}\r\n# one\r\n{good}\r\n# two\r\n{bad}\r\n"), 5, "D5"),
        ("blank rows", format!("\n{head}\n\n\n{bad}\n"), 5, "D5"),
        ("blank rows, CRLF", format!("\r\n{head}\r\n\r\n\r\n{bad}\r\n"), 5, "D5"),
        ("rows of spaces and separators", format!("{head}\n  \n,,,,\n{bad}\n"), 4, "D4"),
        ("line break in quotes", format!("{head}\n\"big\nhouse\",A,an,2,1\n{bad}\n"), 4, "D3"),
        ("CRLF in quotes", format!("{head}\r\n\"big\r\n\r\nhouse\",A,an,2,1\r\n{bad}\r\n"), 5, "D3"),
        ("line break in the bad row itself", format!("{head}\n\"big\nshop\",A,bn,x,1\n"), 2, "D2"),
        ("quoted comment of two lines", format!("{head}\n\"# a,\nb\",,,,\n{bad}\n"), 4, "D3"),
        ("separator line is no spreadsheet row", format!("sep=,\n{head}\n{bad}\n"), 3, "D2"),
        ("comment with a lone quote", format!("{head}\n# 3\" duct, \"old\n{bad}\n"), 3, "D3"),
    ] {
        let place = place(&text);
        assert_eq!((place.row, place.cell.as_deref()), (line, Some(cell)), "{name}");
        assert_eq!((place.file.as_str(), place.column.as_deref()), ("loads.csv", Some("kw")), "{name}");
        assert_eq!(place.found.as_deref(), Some("x"), "{name}");
        let shown = if name == "line break in the bad row itself" { "\"big" } else { bad };
        assert_eq!(place.row_text.as_deref(), Some(shown), "{name}");
    }
}

#[test]
fn line_of_a_fault_after_a_broken_quote() {
    let text = "load,node,phases,kw,pf\n\"house,A,an,2,1\nshop,A,bn,x,1\n";
    let reading = read_with(&[("loads.csv", text)]);
    let rows: Vec<_> =
        reading.diagnostics.items().iter().filter_map(|d| d.place.as_ref()).map(|p| p.row).collect();
    assert_eq!(rows, [2, 3]);
}

#[test]
fn faults_come_in_the_order_of_files_and_rows() {
    let reading = read_with(&[
        ("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,x,y\nshop,A,bn,z,1\n"),
        ("source.csv", "node,kv\nS,x\n"),
        ("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,abcn,x,cable\n"),
    ]);
    let at: Vec<_> = reading
        .diagnostics
        .items()
        .iter()
        .filter_map(|d| d.place.as_ref())
        .map(|p| format!("{} {}", p.file, p.cell.as_deref().unwrap_or("")))
        .collect();
    assert_eq!(at, ["source.csv B2", "lines.csv E2", "loads.csv D2", "loads.csv E2", "loads.csv D3"]);
}

#[test]
fn columns_beyond_z_have_two_letters() {
    let notes: String = (0..25).map(|i| format!(",note{i}")).collect();
    let blanks = ",".repeat(25);
    let text = format!("load,node,phases{notes},kw,pf\nhouse,A,an{blanks},x,1\n");
    assert_eq!(place(&text).cell.as_deref(), Some("AC2"));
}
