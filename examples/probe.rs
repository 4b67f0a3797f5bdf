fn main() {
    let a: Vec<String> = std::env::args().collect();
    let dive = fixability::dive::Dive::read(std::path::Path::new(&a[1])).unwrap();
    let setup = fixability::assess::Setup::new(&dive);
    let t = std::time::Instant::now();
    let r = fixability::alias::look_alikes(&dive, &Default::default(), (setup.provenance("x"), setup.parameters(), setup.chart_landmarks()));
    println!("{:?} found {} fix {} layouts {} {}", t.elapsed(), r.found, r.within_fix_size, r.in_layouts, r.unlisted());
    for l in &r.look_alikes { println!("{} {:?} n{} apart {:.0} brg {:.0} turn {:.2} rms {:.1} worst {:.1} break {:.3} line {:.0} {:?} tt {:?} {:?} {}", l.number, l.kind, l.landmarks, l.apart_m, l.bearing_deg, l.turn_deg, l.disagreement_rms_m, l.disagreement_worst_m, l.break_scale, l.line_m, l.layout, l.tell_tale_1.as_ref().map(|t| (t.landmark.clone(), t.from_edge_m)), l.tell_tale_2.as_ref().map(|t| (t.landmark.clone(), t.from_edge_m)), l.ground_1.iter().zip(&l.ground_2).take(4).map(|(a,b)| format!("{a}>{b}")).collect::<Vec<_>>().join(" ")); }
}
