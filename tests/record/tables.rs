//! The tables, read back by a reader of the same standard.

use csv::StringRecord;
use ebbmark::measurement::RowStatus;
use ebbmark::record::{cycles_csv, positions_csv};

use crate::record::double::Double;

/// Half of the last decimal that a length or a time is written with, m or s.
const HALF_A_NANO: f64 = 0.5e-9 + 1e-15;

fn read(bytes: &[u8]) -> (StringRecord, Vec<StringRecord>) {
    let mut reader = csv::Reader::from_reader(bytes);
    let header = reader.headers().unwrap().clone();
    (header, reader.records().map(Result::unwrap).collect())
}

fn assert_close(text: &str, wanted: Option<f64>, what: &str) {
    match wanted {
        None => assert_eq!(text, "", "{what}"),
        Some(wanted) => {
            let got: f64 = text.parse().unwrap();
            assert!(
                (got - wanted).abs() <= HALF_A_NANO,
                "{what}: wanted {wanted}, got {text}"
            );
        }
    }
}

#[test]
fn positions_read_back_to_the_rows_they_came_from() {
    let measurement = Double::film(300).build();
    let bytes = positions_csv(&measurement).unwrap();
    let (header, records) = read(&bytes);
    let wanted = "frame,t_s,u_t_s,x_m,u_x_m,off_axis_m,x_px,y_px,match,status,fit_m,residual_m";
    assert_eq!(header.iter().collect::<Vec<_>>().join(","), wanted);
    assert_eq!(records.len(), measurement.rows.len());
    for (record, row) in records.iter().zip(&measurement.rows) {
        let what = format!("frame {}", row.frame);
        assert_eq!(record[0], row.frame.to_string());
        assert_close(&record[1], Some(row.t_s), &what);
        assert_close(&record[3], row.x_m, &what);
        assert_close(&record[4], row.u_x_m, &what);
        assert_close(&record[10], row.fit_m, &what);
        assert_close(&record[11], row.residual_m, &what);
        let x_px = row.p_px.map(|p| p[0]);
        assert_eq!(record[6].is_empty(), x_px.is_none(), "{what}");
        if let Some(x_px) = x_px {
            assert!(
                (record[6].parse::<f64>().unwrap() - x_px).abs() < 0.51e-4,
                "{what}"
            );
        }
    }
}

#[test]
fn a_lost_frame_keeps_its_row_with_empty_fields() {
    let measurement = Double::film(300).build();
    let (_, records) = read(&positions_csv(&measurement).unwrap());
    assert_eq!(measurement.rows[145].status, RowStatus::Lost);
    let fields: Vec<&str> = records[145].iter().collect();
    assert_eq!(
        fields,
        [
            "145",
            "2.416666667",
            "0.000000000",
            "",
            "",
            "",
            "",
            "",
            "",
            "lost",
            "",
            ""
        ]
    );
    assert_eq!(&records[77][9], "outlier");
    assert_eq!(&records[5][9], "outside");
    assert_eq!(&records[200][9], "used");
}

#[test]
fn lines_end_as_the_standard_asks_and_no_zero_is_negative() {
    let mut measurement = Double::film(300).build();
    measurement.rows[100].x_m = Some(-1e-12);
    let text = String::from_utf8(positions_csv(&measurement).unwrap()).unwrap();
    assert_eq!(
        text.matches("\r\n").count(),
        301,
        "RFC 4180, header included"
    );
    assert_eq!(text.matches('\n').count(), 301);
    assert!(!text.contains("-0.000000000"), "−1 pm is written as 0");
}

#[test]
fn a_number_that_is_not_finite_is_an_empty_field() {
    let mut measurement = Double::film(300).build();
    measurement.rows[100].residual_m = Some(f64::NAN);
    let (_, records) = read(&positions_csv(&measurement).unwrap());
    assert_eq!(&records[100][11], "");
}

#[test]
fn cycles_carry_energies_only_where_a_mass_is_known() {
    let plain = Double::film(900).build();
    let (header, records) = read(&cycles_csv(&plain).unwrap());
    assert_eq!(header.len(), 10);
    assert_eq!(records.len(), plain.cycles.len());
    assert_close(
        &records[3][6],
        plain.cycles[3].amplitude_m,
        "amplitude of cycle 4",
    );
    assert_eq!(&records[0][8], "", "the first cycle has none before it");

    let weighed = Double::film(900).with_mass().build();
    let (header, records) = read(&cycles_csv(&weighed).unwrap());
    assert_eq!(
        header.iter().skip(10).collect::<Vec<_>>(),
        ["energy_j", "u_energy_j"]
    );
    let stiffness = weighed.energy.as_ref().unwrap().stiffness.value.unwrap();
    let wanted = 0.5 * stiffness * weighed.cycles[2].amplitude_m.unwrap().powi(2);
    let got: f64 = records[2][10].parse().unwrap();
    assert!(
        (got - wanted).abs() < 1e-11,
        "wanted {wanted} J, got {got} J"
    );
}
