//! Reading a table of positions and times: ours, a motion sensor's, anybody's.

use super::{MeasureError, RecordRow, RowStatus, clip};
use std::path::Path;

/// Largest table that is read, bytes: a million rows of a hundred characters.
const MAX_BYTES: u64 = 100 << 20;

/// Columns of a table; the first two must be there.
struct Columns {
    t_s: usize,
    x_m: usize,
    u_t_s: Option<usize>,
    u_x_m: Option<usize>,
    status: Option<usize>,
}

/// The rows of a table, its file name and its SHA-256.
pub(super) fn read(table: &Path) -> Result<(Vec<RecordRow>, String, String), MeasureError> {
    let failed = |reason: String| MeasureError::Table {
        path: table.to_path_buf(),
        reason,
    };
    let unreadable = |error: std::io::Error| match error.kind() {
        std::io::ErrorKind::NotFound => {
            failed("there is no such file; check the name of the table".to_owned())
        }
        _ => failed(format!(
            "cannot be read ({error}); check the name and its permissions"
        )),
    };
    let metadata = std::fs::metadata(table).map_err(unreadable)?;
    if !metadata.is_file() {
        return Err(failed(
            "this is not an ordinary file; name a CSV table".to_owned(),
        ));
    }
    if metadata.len() > MAX_BYTES {
        return Err(failed(format!(
            "the table has {} bytes and the limit is {MAX_BYTES}; cut it to the oscillation",
            metadata.len()
        )));
    }
    let bytes = std::fs::read(table).map_err(unreadable)?;
    let rows = rows(&bytes).map_err(failed)?;
    let sha256 = clip::sha256(table).map_err(unreadable)?;
    let name = table
        .file_name()
        .map_or_else(String::new, |name| name.to_string_lossy().into_owned());
    Ok((rows, name, sha256))
}

/// The rows of CSV bytes (RFC 4180, comma, header line); an error is a sentence without the file's name.
fn rows(bytes: &[u8]) -> Result<Vec<RecordRow>, String> {
    // A spreadsheet may put a byte-order mark before the first header.
    let bytes = bytes.strip_prefix("\u{feff}".as_bytes()).unwrap_or(bytes);
    let mut reader = csv::ReaderBuilder::new()
        .trim(csv::Trim::All)
        .from_reader(bytes);
    let header = reader
        .headers()
        .map_err(|error| format!("is no CSV table ({error}); save it as UTF-8 CSV"))?;
    let find = |name: &str| header.iter().position(|title| title == name);
    let needed = |name: &str| {
        let titles: Vec<&str> = header.iter().take(12).collect();
        find(name).ok_or_else(|| {
            format!(
                "has no column `{name}` (its first line reads `{}`); name the columns t_s and x_m",
                titles.join(",")
            )
        })
    };
    let columns = Columns {
        t_s: needed("t_s")?,
        x_m: needed("x_m")?,
        u_t_s: find("u_t_s"),
        u_x_m: find("u_x_m"),
        status: find("status"),
    };
    let mut rows = Vec::new();
    for record in reader.records() {
        let record =
            record.map_err(|error| format!("is no CSV table ({error}); save it as UTF-8 CSV"))?;
        let line = record.position().map_or(0, csv::Position::line);
        rows.push(row(&record, rows.len(), line, &columns)?);
    }
    fill_missing_u(&mut rows);
    if rows.is_empty() {
        return Err(
            "holds no rows below its header; give a table of positions and times".to_owned(),
        );
    }
    Ok(rows)
}

/// A row without an uncertainty among rows with one weighs like the median of them.
fn fill_missing_u(rows: &mut [RecordRow]) {
    let mut known: Vec<f64> = rows.iter().filter_map(|row| row.u_x_m).collect();
    known.sort_by(f64::total_cmp);
    if let Some(&median) = known.get(known.len() / 2) {
        for row in rows.iter_mut().filter(|row| row.x_m.is_some()) {
            row.u_x_m.get_or_insert(median);
        }
    }
}

fn row(
    record: &csv::StringRecord,
    frame: usize,
    line: u64,
    columns: &Columns,
) -> Result<RecordRow, String> {
    let number = |column: usize, name: &str| match record.get(column).unwrap_or("") {
        "" => Ok(None),
        text => match text.parse::<f64>() {
            Ok(value) if value.is_finite() => Ok(Some(value)),
            _ => Err(format!(
                "line {line}: {name} is `{text}`, not a finite number; write it like 1.25"
            )),
        },
    };
    let spread = |column: Option<usize>, name: &str| match column
        .map_or(Ok(None), |column| number(column, name))?
    {
        Some(u) if u < 0.0 => Err(format!(
            "line {line}: {name} is {u}, and an uncertainty cannot be negative; correct it or leave it empty"
        )),
        u => Ok(u),
    };
    let t_s = number(columns.t_s, "t_s")?
        .ok_or_else(|| format!("line {line}: t_s is empty; every row needs a time"))?;
    let x_m = number(columns.x_m, "x_m")?;
    let outside = columns.status.and_then(|column| record.get(column)) == Some("outside");
    Ok(RecordRow {
        frame,
        t_s,
        u_t_s: spread(columns.u_t_s, "u_t_s")?.unwrap_or(0.0),
        x_m,
        // A zero says that no uncertainty is known, and weighs like its neighbours' absence would.
        u_x_m: spread(columns.u_x_m, "u_x_m")?.filter(|&u| u > 0.0),
        off_axis_m: None,
        p_px: None,
        match_score: None,
        status: match (x_m, outside) {
            (None, _) => RowStatus::Lost,
            (Some(_), true) => RowStatus::Outside,
            (Some(_), false) => RowStatus::Used,
        },
        fit_m: None,
        residual_m: None,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_table_with_marks_of_a_spreadsheet_is_read() {
        let rows = rows(
            "\u{feff}x_m, t_s ,note\r\n0.1,0.0,first\r\n,0.5,lost\r\n-0.1,1.0,\r\n".as_bytes(),
        )
        .unwrap();
        assert_eq!(rows.len(), 3);
        assert_eq!(rows[0].x_m, Some(0.1));
        assert_eq!(rows[1].status, RowStatus::Lost);
        assert!((rows[2].t_s - 1.0).abs() < f64::EPSILON);
    }

    #[test]
    fn what_is_wrong_is_said_with_its_line() {
        for (text, wanted) in [
            ("", "no column `t_s`"),
            ("t_s\n1\n", "no column `x_m`"),
            ("t_s,x_m\n", "no rows"),
            ("t_s,x_m\n0,0\n1,abc\n", "line 3: x_m is `abc`"),
            ("t_s,x_m\n,0\n", "line 2: t_s is empty"),
            ("t_s,x_m\n0,NaN\n", "line 2: x_m is `NaN`"),
            ("t_s,x_m,u_x_m\n0,0,-1\n", "line 2: u_x_m is -1"),
            ("t_s,x_m\n0,0,0\n", "is no CSV table"),
            ("t_s,x_m\n\"0,0\n", "no CSV table"),
        ] {
            let Err(reason) = rows(text.as_bytes()) else {
                panic!("accepted: {text}")
            };
            assert!(reason.contains(wanted), "{text:?}: {reason}");
        }
        assert!(rows(b"t_s,x_m\n\xff\xfe,0\n").is_err());
    }
}
