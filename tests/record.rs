//! The record from the outside: a folder of files that a person, a spreadsheet and a program can read.

#[path = "record/double.rs"]
mod double;

#[test]
fn look() {
    let out = std::path::Path::new("/tmp/record-look");
    std::fs::create_dir_all(out).unwrap();
    let cases = [
        ("film", double::Double::film(3600).with_mass()),
        ("nomass", double::Double::film(900)),
        ("table", double::Double::table(900).with_open_bounds()),
        ("upright", double::Double::film(1800).upright().with_open_bounds().named("a <script>alert(1)</script> & \"b\".mov")),
    ];
    for (name, double) in cases {
        let m = double.build();
        let dir = out.join(name);
        ebbmark::record::check_destination(&dir).unwrap();
        ebbmark::record::write(&m, &dir).unwrap();
        println!("{}", ebbmark::record::summary(&m));
    }
}
