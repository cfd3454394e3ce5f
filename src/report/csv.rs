//! One line a fit, for spreadsheets.

use super::Document;
use super::number::exact;
use crate::infer::{Multiplier, Test};

/// Header and one line a document. Columns are the union over the documents, in order of first appearance; what a fit
/// does not have stays empty.
pub fn render(documents: &[Document]) -> String {
    let groups = union(documents.iter().flat_map(|d| d.group.iter().flatten().map(|(column, _)| column.as_str())));
    let parameters = union(documents.iter().flat_map(|d| d.model.parameters.iter().map(|p| p.name.as_str())));
    let restrictions =
        union(documents.iter().flat_map(|d| d.outcome.restricted.multipliers.iter().map(|m| m.name.as_str())));
    let mut header: Vec<String> = groups.iter().map(|g| (*g).to_string()).collect();
    let fixed = [
        "verdict",
        "rows_used",
        "weight_total",
        "log_likelihood",
        "score_chi_square",
        "score_df",
        "score_p",
        "score_p_adjusted",
    ];
    header.extend(fixed.map(String::from));
    header.extend(parameters.iter().flat_map(|n| [format!("{n}.value"), format!("{n}.se")]));
    header.extend(restrictions.iter().flat_map(|n| [format!("{n}.pull"), format!("{n}.pull_se"), format!("{n}.p")]));
    let mut out = row(&header);
    for document in documents {
        out.push_str(&row(&cells(document, &groups, &parameters, &restrictions)));
    }
    out
}

fn cells(document: &Document, groups: &[&str], parameters: &[&str], restrictions: &[&str]) -> Vec<String> {
    let Document { group, data, outcome, .. } = document;
    let figure = |x: Option<f64>| x.map_or_else(String::new, exact);
    let label = |column: &&str| {
        let found = group.iter().flatten().find(|(name, _)| name == column);
        found.map_or_else(String::new, |(_, label)| label.clone())
    };
    let block = &outcome.restricted;
    let score: Option<&Test> = outcome.score.as_ref().ok();
    let mut cells: Vec<String> = groups.iter().map(label).collect();
    cells.push(block.fit.certificate.verdict.text().to_string());
    cells.push(data.rows_used.to_string());
    cells.push(exact(data.weight_total));
    cells.push(exact(block.fit.log_likelihood));
    cells.push(figure(score.map(|t| t.chi_square)));
    cells.push(score.map_or_else(String::new, |t| t.df.to_string()));
    cells.push(figure(score.map(|t| t.p)));
    cells.push(String::new());
    for name in parameters {
        let estimate = block.estimates.iter().find(|e| e.name == *name);
        cells.push(figure(estimate.map(|e| e.value)));
        cells.push(figure(estimate.and_then(|e| e.se)));
    }
    for name in restrictions {
        let line: Option<&Multiplier> = block.multipliers.iter().find(|m| m.name == *name);
        cells.push(figure(line.and_then(|m| m.value)));
        cells.push(figure(line.and_then(|m| m.se)));
        cells.push(figure(line.and_then(|m| m.p)));
    }
    cells
}

/// Each text once, in order of first appearance.
fn union<'a>(texts: impl Iterator<Item = &'a str>) -> Vec<&'a str> {
    let mut seen = std::collections::HashSet::new();
    texts.filter(|text| seen.insert(*text)).collect()
}

/// Cells joined by commas, quoted where RFC 4180 asks for it.
fn row(cells: &[String]) -> String {
    let quoted = |cell: &String| {
        let plain = !cell.contains([',', '"', '\n', '\r']);
        if plain { cell.clone() } else { format!("\"{}\"", cell.replace('"', "\"\"")) }
    };
    cells.iter().map(quoted).collect::<Vec<_>>().join(",") + "\n"
}

#[cfg(test)]
mod tests {
    use super::super::sample;
    use super::*;

    #[test]
    fn one_line_a_fit() {
        let mut north = sample::good(&["a", "b,c"]);
        north.group = Some(vec![("kiln".into(), "north \"1\"".into())]);
        let mut south = sample::failed();
        south.group = Some(vec![("kiln".into(), "south".into())]);
        let text = render(&[north, south]);
        let lines: Vec<&str> = text.lines().collect();
        assert_eq!(
            lines[0],
            "kiln,verdict,rows_used,weight_total,log_likelihood,score_chi_square,score_df,score_p,score_p_adjusted,\
             a.value,a.se,\"b,c.value\",\"b,c.se\",depth.value,depth.se,spread.value,spread.se,\
             shares.pull,shares.pull_se,shares.p,same_slope.1.pull,same_slope.1.pull_se,same_slope.1.p"
        );
        assert!(lines[1].starts_with("\"north \"\"1\"\"\",strict maximum,240,1152.5,-77.3655441898635,9.95,1,0.00160"));
        assert!(lines[1].ends_with(",,0.52,0.0451,0.0,0.0,,,,,240.0,,,-41.23,13.07,0.0016"));
        assert_eq!(lines[2], "south,flat,240,1152.5,-77.3655441898635,,,,,,,,,,,,,,,,,,");
        assert_eq!(lines.len(), 3);
    }
}
