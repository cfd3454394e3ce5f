//! Design columns over all rows, orthogonalised where their conditioning asks for it.

use super::LikelihoodError;
use super::design;
use super::plan::{Bound, PredictorPlan};
use super::rows::Rows;
use super::statement::Statement;
use crate::data::Table;
use crate::expr::{Name, parse_expression, rows as columns};
use crate::math::Matrix;
use crate::math::linear::{orthogonalise, scaled_condition};

/// Condition number of the scaled Gram matrix of a design beyond which its columns are orthogonalised: Newton's equations
/// keep half the digits of a double there, and the QR of the columns keeps the rest.
const ILL_CONDITIONED: f64 = 1e8;

/// Design columns by predictor and coefficient over all rows, orthogonalised where their conditioning asks for it.
pub(super) struct Designs {
    pub(super) columns: Vec<Vec<Vec<f64>>>,
    pub(super) offsets: Vec<Option<Vec<f64>>>,
    /// Where each orthogonalised block of coefficients begins, and its R.
    pub(super) blocks: Vec<(usize, Matrix)>,
}

pub(super) fn designs(
    rows: &Rows,
    table: &Table,
    statement: &Statement,
    predictors: &[PredictorPlan],
    bound: &[Vec<Vec<Bound>>],
) -> Result<Designs, LikelihoodError> {
    let mut out = Designs { columns: Vec::new(), offsets: Vec::new(), blocks: Vec::new() };
    for (k, p) in predictors.iter().enumerate() {
        let mut columns: Vec<Vec<f64>> = p.coefficients.iter().map(|c| design::column(c, table)).collect();
        let mut offset = match &p.terms.offset {
            None => None,
            Some(text) => {
                let place = format!("{}.offset", statement.rows[p.local.row].place);
                let ast = parse_expression(text).map_err(LikelihoodError::expression(place.clone()))?;
                let find = |n: &Name| {
                    n.as_single().and_then(|n| table.column(n)).map(|c| match &c.values {
                        crate::data::Values::Number(x) => columns::ColumnView::Number(x),
                        crate::data::Values::Category { codes, levels } => {
                            columns::ColumnView::Category { codes, levels }
                        }
                    })
                };
                let x =
                    columns::evaluate(&ast, &find, table.rows).map_err(LikelihoodError::expression(place.clone()))?;
                if let Some(row) = x.iter().position(|v| !v.is_finite()) {
                    return Err(LikelihoodError::Data(format!(
                        "{}, line {}: the offset {text} is {} there; every row needs a finite number",
                        table.file,
                        table.line(row),
                        x[row]
                    )));
                }
                Some(x)
            }
        };
        for (level, b) in bound.iter().enumerate() {
            let members = &rows.members[level];
            for (j, b) in b[k].iter().enumerate() {
                if let Bound::Known(x) = b
                    && *x != 0.0
                {
                    let o = offset.get_or_insert_with(|| vec![0.0; rows.count]);
                    members.iter().for_each(|&i| o[i] += x * columns[j][i]);
                }
            }
        }
        // one set of coefficients for all rows, or one a level
        let sets: Vec<(usize, Vec<usize>)> = if p.setting.shared || bound.len() == 1 {
            vec![(0, (0..rows.count).collect())]
        } else {
            rows.members.iter().cloned().enumerate().collect()
        };
        for (level, members) in sets {
            let free: Vec<(usize, usize)> = bound[level][k]
                .iter()
                .enumerate()
                .filter_map(|(j, b)| if let Bound::Free(i) = b { Some((j, *i)) } else { None })
                .collect();
            if let Some(block) = orthogonal(&mut columns, &free, &members, rows.count) {
                out.blocks.push(block);
            }
        }
        out.columns.push(columns);
        out.offsets.push(offset);
    }
    Ok(out)
}

fn orthogonal(
    columns: &mut [Vec<f64>],
    free: &[(usize, usize)],
    members: &[usize],
    count: usize,
) -> Option<(usize, Matrix)> {
    if free.len() < 2 || members.len() < free.len() {
        return None;
    }
    let gathered: Vec<Vec<f64>>;
    let list: Vec<&[f64]> = if members.len() == count {
        free.iter().map(|&(j, _)| &columns[j][..]).collect()
    } else {
        gathered = free.iter().map(|&(j, _)| members.iter().map(|&i| columns[j][i]).collect()).collect();
        gathered.iter().map(Vec::as_slice).collect()
    };
    let condition = scaled_condition(&list, None);
    if condition.is_nan() || condition < ILL_CONDITIONED {
        return None;
    }
    // a design without full rank stays as it is: the certificate will name the flat direction
    let qr = orthogonalise(&list, None).ok().filter(|q| q.rank == free.len())?;
    for (q, &(j, _)) in qr.q.iter().zip(free) {
        members.iter().zip(q).for_each(|(&i, &x)| columns[j][i] = x);
    }
    Some((free[0].1, qr.r))
}
