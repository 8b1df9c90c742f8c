//! Numbers as they are typed: `452,274,27,27`.

/// Four numbers with commas between them.
///
/// # Errors
/// A sentence that says what was typed; whether the numbers can be is the run sheet's business.
pub(super) fn four(text: &str) -> Result<[f64; 4], String> {
    let numbers: Vec<f64> = text.split(',').map(one).collect::<Result<_, _>>()?;
    let n = numbers.len();
    numbers.try_into().map_err(|_| {
        format!("four numbers with commas between them are needed, and `{text}` has {n}")
    })
}

/// One number.
///
/// # Errors
/// A sentence that says what was typed.
pub(super) fn one(text: &str) -> Result<f64, String> {
    text.trim()
        .parse()
        .map_err(|_| format!("`{text}` is not a number; write it like 0.5"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn four_numbers_are_four_numbers() {
        assert_eq!(four("1, 2.5,-3,4e2"), Ok([1.0, 2.5, -3.0, 400.0]));
        assert!(four("1,2,3").unwrap_err().contains("has 3"));
        assert!(four("1,2,3,x").unwrap_err().contains("`x`"));
        assert!(four("").is_err());
    }
}
