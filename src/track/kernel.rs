//! The innermost loop: sums of products of 16-bit luma, as wide as the processor allows.
#![allow(
    unsafe_code,
    reason = "one call of the same code compiled for AVX2, after the processor was asked for it"
)]

/// Σ f·t under every position of a template.
///
/// * `field`: rows of `field_width` values within ±2048; `template`: `rows` rows of `columns` values within ±4095.
/// * `out`: (`out_columns` × rows of positions), filled row by row; element (v, u) is the sum with the template's corner at (u, v).
///
/// Integers throughout: the order of additions does not matter, so that every machine gives the same sums.
pub(super) fn products(
    field: &[i16],
    field_width: usize,
    template: &[i16],
    columns: usize,
    out_columns: usize,
    out: &mut [i64],
) {
    #[cfg(target_arch = "x86_64")]
    if std::arch::is_x86_feature_detected!("avx2") {
        // SAFETY: the processor has AVX2, the only thing the function asks for beyond safe code.
        unsafe { products_avx2(field, field_width, template, columns, out_columns, out) };
        return;
    }
    products_plain(field, field_width, template, columns, out_columns, out);
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
fn products_avx2(
    field: &[i16],
    field_width: usize,
    template: &[i16],
    columns: usize,
    out_columns: usize,
    out: &mut [i64],
) {
    products_plain(field, field_width, template, columns, out_columns, out);
}

/// Columns whose products are summed in 32 bits: 2¹¹ · 2¹² · 128 = 2³⁰.
const BLOCK: usize = 128;

#[inline(always)]
fn products_plain(
    field: &[i16],
    field_width: usize,
    template: &[i16],
    columns: usize,
    out_columns: usize,
    out: &mut [i64],
) {
    for (v, out_row) in out.chunks_exact_mut(out_columns).enumerate() {
        for (u, sum) in out_row.iter_mut().enumerate() {
            let mut total = 0_i64;
            for (row, template_row) in template.chunks_exact(columns).enumerate() {
                let start = (v + row) * field_width + u;
                let field_row = &field[start..start + columns];
                for (f, t) in field_row.chunks(BLOCK).zip(template_row.chunks(BLOCK)) {
                    total += i64::from(dot(f, t));
                }
            }
            *sum = total;
        }
    }
}

/// Written so that the compiler finds the multiply-add of 16-bit pairs.
#[inline(always)]
fn dot(f: &[i16], t: &[i16]) -> i32 {
    f.iter()
        .zip(t)
        .map(|(&f, &t)| i32::from(f) * i32::from(t))
        .sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_wide_and_the_plain_code_give_the_same_sums_as_the_definition() {
        let (field_width, field_height, columns, rows) = (211, 12, 150, 5);
        let value = |k: usize, range: usize| {
            i16::try_from(k * 7919 % (2 * range + 1)).unwrap() - i16::try_from(range).unwrap()
        };
        let field: Vec<i16> = (0..field_width * field_height)
            .map(|k| value(k, 2048))
            .collect();
        let template: Vec<i16> = (0..columns * rows)
            .map(|k| value(3 * k + 1, 4095))
            .collect();
        let (out_columns, out_rows) = (field_width - columns + 1, field_height - rows + 1);
        let mut wide = vec![0; out_columns * out_rows];
        products(
            &field,
            field_width,
            &template,
            columns,
            out_columns,
            &mut wide,
        );
        let mut plain = vec![0; out_columns * out_rows];
        products_plain(
            &field,
            field_width,
            &template,
            columns,
            out_columns,
            &mut plain,
        );
        assert_eq!(wide, plain);
        for (v, u) in [(0, 0), (3, 17), (out_rows - 1, out_columns - 1)] {
            let mut wanted = 0_i64;
            for row in 0..rows {
                for column in 0..columns {
                    wanted += i64::from(field[(v + row) * field_width + u + column])
                        * i64::from(template[row * columns + column]);
                }
            }
            assert_eq!(wide[v * out_columns + u], wanted);
        }
    }

    #[test]
    fn the_largest_values_do_not_overflow() {
        let field = [-2048_i16; 600];
        let template = [4095_i16; 600];
        let mut out = [0];
        products(&field, 600, &template, 600, 1, &mut out);
        assert_eq!(out[0], -2048 * 4095 * 600);
    }
}
