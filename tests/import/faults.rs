//! Broken inputs, each with everything that is said of it, kept as snapshots.

use super::{LINES, LOADS, MATRICES, SOURCE, lines_of, read, read_with};

type Files = &'static [(&'static str, &'static str)];

/// Files that replace those of the good network.
const CELLS: &[(&str, Files)] = &[
    // Numbers.
    (
        "number with letters",
        &[("lines.csv", "line,from,to,phases,length_km,construction\nL1,S,A,abcn,12x,cable\n")],
    ),
    (
        "number with its unit",
        &[("lines.csv", "line,from,to,phases,length_km,construction\nL1,S,A,abcn,0.4 km,cable\n")],
    ),
    ("word for a number", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,two,0.95\n")]),
    ("decimal comma between commas", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,\"2,5\",0.95\n")]),
    ("decimal comma not quoted", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,2,5,0.95\n")]),
    (
        "thousands or decimals, commas",
        &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,\"1,234\",0.95\n")],
    ),
    ("thousands or decimals, semicolons", &[("loads.csv", "load;node;phases;kw;pf\nhouse;A;an;1,234;1\n")]),
    (
        "thousands or decimals, dot among commas",
        &[("loads.csv", "load;node;phases;kw;pf\nhouse;A;an;12,5;1\nshop;A;bn;1.234;1\n")],
    ),
    ("two marks", &[("loads.csv", "load;node;phases;kw;pf\nhouse;A;an;1.234,5;1\n")]),
    ("groups of digits", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,\"1,234,567\",0.95\n")]),
    (
        "spreadsheet error values",
        &[(
            "loads.csv",
            "load,node,phases,kw,pf\n#REF!,A,an,2,0.95\nshop,#N/A,bn,2,0.95\nfarm,A,cn,#DIV/0!,0.95\n",
        )],
    ),
    (
        "percent sign outside a percent column",
        &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,2,95 %\n")],
    ),
    ("power factor in percent", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,2,95\n")]),
    ("power factor of nothing", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,2,0\n")]),
    (
        "not finite",
        &[("loads.csv", "load,node,phases,kw,kvar\nhouse,A,an,NaN,0\nshop,A,bn,1,inf\nfarm,A,cn,1e999,0\n")],
    ),
    ("hexadecimal", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,0x10,1\n")]),
    ("date for a number", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,2026-04-03,1\n")]),
    ("too large", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,1e15,1\n")]),
    ("length zero", &[("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,abcn,0,cable\n")]),
    (
        "length negative",
        &[("lines.csv", "line,from,to,phases,length_ft,construction\nL1,S,A,abcn,-30,cable\n")],
    ),
    ("length missing", &[("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,abcn,,cable\n")]),
    (
        "length twice",
        &[("lines.csv", "line,from,to,phases,length_m,length_km,construction\nL1,S,A,abcn,100,0.1,cable\n")],
    ),
    (
        "sets not whole",
        &[("lines.csv", "line,from,to,phases,length_m,construction,sets\nL1,S,A,abcn,100,cable,1.5\n")],
    ),
    (
        "sets none",
        &[("lines.csv", "line,from,to,phases,length_m,construction,sets\nL1,S,A,abcn,100,cable,0\n")],
    ),
    (
        "rating zero",
        &[("lines.csv", "line,from,to,phases,length_m,construction,rating_a\nL1,S,A,abcn,100,cable,0\n")],
    ),
    ("thousands or nothing, commas", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,\"1,200\",0.95\n")]),
    (
        "percentages as fractions",
        &[(
            "study.csv",
            "setting,value\nvoltage_low_percent,0.94\nvoltage_high_percent,1.06\ndrop_limit_percent,0.05\n\
             unbalance_limit_percent,0.02\nconstant_power_floor_percent,0.7\nload_growth_percent,0.03\n",
        )],
    ),
    ("power in watts", &[("loads.csv", "load,node,phases,W,pf\nhouse,A,an,2000,0.95\n")]),
    (
        "clock number before the last letter",
        &[(
            "transformers.csv",
            "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent\nT,A,B,63,11,0.4,Dy11n,1,4\n",
        )],
    ),
    (
        "names that a spreadsheet has changed",
        &[
            (
                "lines.csv",
                "line,from,to,phases,length_m,construction\n4-Mar,S,A,abcn,100,cable\nL2,A,1.00E+05,abcn,100,cable\n",
            ),
            ("loads.csv", "load,node,phases,kw,pf\nhouse,1.00E+05,an,2,1\n"),
        ],
    ),
    // Words, names and conductors.
    (
        "state misspelt",
        &[("lines.csv", "line,from,to,phases,length_m,construction,state\nL1,S,A,abcn,100,cable,opne\n")],
    ),
    (
        "state in other words",
        &[("lines.csv", "line,from,to,phases,length_m,construction,state\nL1,S,A,abcn,100,cable,yes\n")],
    ),
    ("model misspelt", &[("loads.csv", "load,node,phases,kw,pf,model\nhouse,A,an,2,1,impedence\n")]),
    ("blank names", &[("lines.csv", "line,from,to,phases,length_m,construction\n,S,,abcn,100,\n")]),
    (
        "same line name twice",
        &[(
            "lines.csv",
            "line,from,to,phases,length_m,construction\nL1,S,A,abcn,100,cable\nL1,A,B,abcn,100,cable\n",
        )],
    ),
    ("same load name twice", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,2,1\nhouse,A,bn,2,1\n")]),
    ("nodes alike", &[("loads.csv", "load,node,phases,kw,pf\nhouse,a,an,2,1\nshop, A ,bn,2,1\n")]),
    ("phases unknown", &[("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,abx,100,cable\n")]),
    ("phases mixed", &[("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,aL2,100,cable\n")]),
    ("phases twice", &[("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,aab,100,cable\n")]),
    ("phases a date", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,01. Feb,2,1\n")]),
    ("earth as a conductor", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,ag,2,1\n")]),
    (
        "neutral alone",
        &[
            ("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,n,100,cable\n"),
            ("loads.csv", "load,node,phases,kw,pf\nhouse,A,n,2,1\n"),
        ],
    ),
    ("load on one conductor", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,b,2,1\n")]),
    ("load nowhere", &[("loads.csv", "load,node,line,phases,kw,pf\nhouse,,,an,2,1\n")]),
    ("load at node and line", &[("loads.csv", "load,node,line,phases,kw,pf\nhouse,A,L1,an,2,1\n")]),
    ("load without reactive power", &[("loads.csv", "load,node,phases,kw,kvar,pf\nhouse,A,an,2,,\n")]),
    ("load with kvar and pf", &[("loads.csv", "load,node,phases,kw,kvar,pf\nhouse,A,an,2,1,0.9\n")]),
    ("load without kw", &[("loads.csv", "load,node,phases,kw,pf\nhouse,A,an,,0.9\n")]),
    // Headers.
    (
        "column misspelt",
        &[("lines.csv", "line,from,to,phases,lenght_m,construction\nL1,S,A,abcn,100,cable\n")],
    ),
    (
        "column without unit",
        &[("lines.csv", "line,from,to,phases,length,construction\nL1,S,A,abcn,100,cable\n")],
    ),
    ("column unknown", &[("loads.csv", "load,node,phases,kw,pf,colour\nhouse,A,an,2,1,red\n")]),
    ("column twice", &[("loads.csv", "load,node,phases,kw,KW,pf\nhouse,A,an,2,2,1\n")]),
    ("column missing", &[("lines.csv", "line,from,phases,construction\nL1,S,abcn,cable\n")]),
    ("no header", &[("lines.csv", "L1,S,A,abcn,100,cable\nL2,A,B,abcn,100,cable\n")]),
    (
        "separated by bars",
        &[("lines.csv", "line|from|to|phases|length_m|construction\nL1|S|A|abcn|100|cable\n")],
    ),
    ("per-length unit missing", &[("matrices.csv", "construction,row,column,r_ohm,x\ncable,a,a,0.3,0.09\n")]),
    // Rows.
    (
        "row too long",
        &[("lines.csv", "line;from;to;phases;length_m;construction\nL1;S;A;abcn;100;cable;new\n")],
    ),
    ("row cut off", &[("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,abcn,10\n")]),
    ("column without name", &[("loads.csv", "load,node,phases,kw,pf,,\nhouse,A,an,2,1,,ask Bea\n")]),
    ("quote not closed", &[("loads.csv", "load,node,phases,kw,pf\n\"house,A,an,2,1\nshop,A,bn,x,1\n")]),
    (
        "quote not closed in a comment",
        &[("loads.csv", "load,node,phases,kw,pf\n\"# old,A,an,2,1\nshop,A,bn,x,1\n")],
    ),
    ("quote not closed in the header", &[("loads.csv", "load,\"node,phases,kw,pf\nshop,A,bn,1,1\n")]),
    ("text after a quote", &[("loads.csv", "load,node,phases,kw,pf\n\"house\"2,A,an,2,1\nshop,A,bn,x,1\n")]),
    ("space before a quote", &[("loads.csv", "load,node,phases,kw,pf\nhouse, \"A\",an,2,1\n")]),
    // Files.
    ("empty file", &[("lines.csv", "# nothing yet\n\n")]),
    ("unknown file", &[("line.csv", LINES), ("results.csv", "a,b\n1,2\n")]),
    ("same file twice", &[("LINES.csv", LINES)]),
    ("not text", &[("loads.csv", "load\0,node\n")]),
    ("workbook", &[("loads.csv", "PK\u{3}\u{4}abc")]),
    (
        "generators",
        &[
            (
                "generators.csv",
                "generator,node,phases,kw,kvar,pf,kva,volt_var,volt_watt,priority,state\n\
                 G1,A,an,-5,,1,,,,,\nG2,A,an,5,,,,,,,\nG3,A,an,5,1,0.9,,,,,\nG4,A,an,5,,,,v,,,\nG5,A,an,5,,0.9,6,,,vars,\n\
                 G6,A,an,5,,0,,,,,\nG1,A,an,5,0,,,,,,shut\nG8,A,an,5,0,,0,,,watt,\n",
            ),
            (
                "curves.csv",
                "curve,pu,percent\nv,0.95,40\nv,0.95,20\nv,1.05,60\nv,105,-20\nv,1.1,-120\n,1,0\n",
            ),
        ],
    ),
    (
        "motors",
        &[(
            "motors.csv",
            "motor,node,hp,kw,volts,rpm,amps,pf,efficiency_percent,code,design,load_torque,starter,starter_tap_percent,starter_ramp_s,state\n\
             M1,A,20,15,400,,,,,,,,,,,\nM2,A,20,,400,1500,,,,,,,,,,\nM3,A,20,,400,1460,5,0.85,90,,,,,,,\nM4,A,20,,400,,,,,GG,X,,,,,\n\
             M5,A,20,,400,,,,,,,cubic,soft,65,,\nM6,A,20,,400,,,,,,,,star delta,,,\nM7,A,,,400,,,,,,,,,,,\nM8,A,20,,0.4,,,,,,,,,,,on\n",
        )],
    ),
    ("motors and profiles", &[("motors.csv", "motor,node\nM1,A\n"), ("profiles.csv", "time,house\n0,1\n")]),
    ("motors without rows", &[("motors.csv", "motor,node\n"), ("profiles.csv", "time,house\n")]),
    // Settings.
    (
        "settings",
        &[(
            "study.csv",
            "setting,value\nfrequency_hz,55\nvoltage_lo_percent,90\ncolour,blue\ndrop_limit_percent,-5\n\
         unbalance_limit_percent,two\nneutral_limit_v,0\nname,North\nname,South\n",
        )],
    ),
    ("setting in the wrong layout", &[("study.csv", "name,frequency_hz\nNorth,50\n")]),
    // Source.
    ("source without voltage", &[("source.csv", "node,kv\nS,\n")]),
    ("source in volts", &[("source.csv", "node,kv\nS,11000\n")]),
    ("source held twice", &[("source.csv", "node,kv,pu,pu_a\nS,0.4,1,1.02\n")]),
    ("source held in percent", &[("source.csv", "node,kv,pu\nS,0.4,102\n")]),
    ("fault level without ratio", &[("source.csv", "node,kv,mva_3ph,x_over_r_1ph\nS,0.4,12,3\n")]),
    ("single-phase fault level alone", &[("source.csv", "node,kv,mva_1ph,x_over_r_1ph\nS,0.4,12,3\n")]),
    // Nodes.
    ("node rows", &[("nodes.csv", "node,x,y,earth_ohm\nA,1,,10\nA,1,2,-3\n")]),
    // Matrices.
    (
        "matrix incomplete",
        &[(
            "matrices.csv",
            "construction,row,column,r_ohm_per_km,x_ohm_per_km\ncable,a,a,0.3,0.09\ncable,b,b,0.3,0.09\ncable,c,b,0.05,0.01\n",
        )],
    ),
    (
        "matrix element twice",
        &[(
            "matrices.csv",
            "construction,row,column,r_ohm_per_km,x_ohm_per_km\nc,a,a,0.3,0.09\nc,b,b,0.3,0.09\nc,a,b,0.05,0.01\nc,b,a,0.05,0.01\n",
        )],
    ),
    (
        "matrix conductor pairs",
        &[("matrices.csv", "construction,row,column,r_ohm_per_km,x_ohm_per_km\ncable,ab,a,0.3,0.09\n")],
    ),
    (
        "matrix in two units",
        &[(
            "matrices.csv",
            "construction,row,column,r_ohm_per_km,r_ohm_per_mi,x_ohm_per_km\ncable,a,a,0.3,0.5,0.09\n",
        )],
    ),
    (
        "matrix blank reactance",
        &[("matrices.csv", "construction,row,column,r_ohm_per_km,x_ohm_per_km\ncable,a,a,0.3,\n")],
    ),
    // Switches.
    ("switch faults", &[("switches.csv", "switch,from,to,phases,state\nQ1,A,B,abcn,shut\nQ1,B,C,,closed\n")]),
    // Transformers.
    (
        "transformer without ratings",
        &[(
            "transformers.csv",
            "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent\nT,S,A,0,,-0.4,Dyn11,1,4\n",
        )],
    ),
    (
        "transformer groups",
        &[(
            "transformers.csv",
            "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent\n\
         T1,S,A,100,11,0.4,Dyn,1,4\nT2,S,B,100,11,0.4,Dyn0,1,4\nT3,S,C,100,11,0.4,Dzn0,1,4\nT4,S,D,100,11,0.4,star,1,4\nT5,S,E,100,11,0.4,#NAME?,1,4\n",
        )],
    ),
    (
        "transformer terminals",
        &[(
            "transformers.csv",
            "transformer,from,to,phases,kva,kv_from,kv_to,group,r_percent,x_percent\n\
         T1,S,A,,25,6.35,0.24,Ii0,1,4\nT2,S,B,abn,25,6.35,0.24,Ii0,1,4\nT3,S,C,an,100,11,0.4,Dyn11,1,4\n",
        )],
    ),
    (
        "transformer without impedance",
        &[(
            "transformers.csv",
            "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent\nT1,S,A,100,11,0.4,Dyn11,0,0\nT2,S,B,100,11,0.4,Dyn11,,4\nT3,S,C,100,11,0.4,Dyn11,1,400\n",
        )],
    ),
    ("transformer without its columns", &[("transformers.csv", "transformer,from,to,group\nT1,S,A,Dyn11\n")]),
    // Regulators.
    (
        "regulator taps",
        &[(
            "regulators.csv",
            "regulator,from,to,phases,across,tap_a,tap_b,steps\n\
         R1,S,A,a,n,17,,\nR2,S,B,a,n,2,3,\nR3,S,C,a,n,2.5,,\nR4,S,D,a,n,12,,10\n",
        )],
    ),
    (
        "regulator across",
        &[(
            "regulators.csv",
            "regulator,from,to,phases,across,tap_a\nR1,S,A,a,a,1\nR2,S,B,a,bc,1\nR3,S,C,a,x,1\nR1,S,D,a,b,1\n",
        )],
    ),
    (
        "regulator controls that do not fit together",
        &[(
            "regulators.csv",
            "regulator,from,to,phases,set_v,band_v,pt_ratio,limit_v,mode,gang_phase,reverse,reverse_set_v,tap_a\n\
         R1,S,A,abc,120,2,20,120.5,,,,,\nR2,S,B,abc,120,2,20,,gang,,,,\nR3,S,C,abc,120,2,20,,,a,,,\n\
         R4,S,D,ab,120,2,20,,gang,c,,,\nR5,S,E,a,120,2,20,,gang,a,,,\nR6,S,F,abc,120,2,20,,gang,a,,,3\n\
         R7,S,G,abc,120,2,20,,,,reverse,,\nR8,S,H,abc,120,2,20,,,,hold,119,\nR9,S,I,abc,120,2,20,,,,revers,118,\n\
         R10,S,J,abc,120,2,20,0,bank,,,,\n",
        )],
    ),
    // Capacitors.
    (
        "capacitor controls that do not fit together",
        &[(
            "capacitors.csv",
            "capacitor,node,phases,kvar,control,on_v,off_v,pt_ratio,on_kvar,off_kvar,on_a,off_a,sense_line,sense_phase,delay_s\n\
         C1,A,an,10,,118,,,,,,,,,\nC2,A,an,10,voltage,118,118,,,,,,,,\nC3,A,an,10,voltage,124,118,,,,,,,,\n\
         C4,A,abcn,10,voltage,118,124,,,,,,,,\nC5,A,an,10,voltage,118,,,,,,,,,\nC6,A,abc,10,kvar,,,,5,5,,,L1,,\n\
         C7,A,abc,10,kvar,,,,10,,,,,,\nC8,A,abc,10,current,,,2,,,20,40,L1,,\nC9,A,an,10,current,,,,,,40,20,,a,30\n\
         C10,A,an,10,profile,,,,,,,,,,\nC11,A,an,10,volts,,,,,,,,,,\nC12,A,an,10,fixed,,,,,,,,,,10\n\
         C13,A,abcn,10,voltage,118,124,,,,,,,abn,\nC14,A,an,10,voltage,118,124,-2,,,,,L1,,-1\n",
        )],
    ),
    (
        "capacitor faults",
        &[(
            "capacitors.csv",
            "capacitor,node,phases,kvar,kv,state\nC1,A,an,0,,\nC2,A,bn,10,0,\nC2,A,c,10,,\nC4,A,cn,,,on\n",
        )],
    ),
    // Wires and spacings are another reader's.
    ("constructions of wires", &[("constructions.csv", "construction,kind\nOH1,overhead\n")]),
];

/// Whole folders.
const FOLDERS: &[(&str, Files)] = &[
    ("no file at all", &[]),
    ("no source", &[("lines.csv", LINES), ("loads.csv", LOADS), ("matrices.csv", MATRICES)]),
    ("source misspelt", &[("sources.csv", SOURCE), ("lines.csv", LINES), ("matrices.csv", MATRICES)]),
    ("source empty", &[("source.csv", "")]),
];

#[test]
fn every_fault_has_its_words() {
    let mut all = String::new();
    for (name, files) in CELLS {
        let said = lines_of(&read_with(files));
        let harmless = ["motors without rows"];
        assert!(harmless.contains(name) || !said.is_empty(), "{name}: nothing was said");
        all.push_str(&format!("== {name}\n{said}"));
    }
    for (name, files) in FOLDERS {
        let said = lines_of(&read(files));
        assert!(!said.is_empty(), "{name}: nothing was said");
        all.push_str(&format!("== {name}\n{said}"));
    }
    insta::assert_snapshot!("faults_of_files_and_cells", all);
}

#[test]
fn cases_are_many_and_their_names_differ() {
    let mut names: Vec<_> = CELLS.iter().chain(FOLDERS).map(|(name, _)| *name).collect();
    let count = names.len();
    names.sort_unstable();
    names.dedup();
    assert_eq!(names.len(), count);
    assert!(count >= 90, "{count} cases");
}
