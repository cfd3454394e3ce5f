//! From bytes to a table.
//!
//! Order: the cells in use are read; derived columns are made; `only` picks rows; the rows it keeps are looked at for
//! missing cells, then for what their values must be. So a row that `only` leaves out may hold anything in columns that
//! `only` itself does not use. A missing cell that `only` uses does not decide the row: it falls under `on_missing` like
//! any other missing cell in use (with `drop` the row counts as missing, not as filtered). A derived value
//! is missing where a column named in its expression is, whichever branch of an `if` would have been taken. A row of
//! weight 0 adds nothing: it must be readable and its labels count as seen, but it may be incomplete and its values may
//! be out of range or undefined.

use super::error::DataError;
use super::request::Request;
use super::sheet::Sheet;
use super::source::{Source, sniff};
use super::table::Table;
use super::work::Work;
use sha2::{Digest, Sha256};

/// Reads a table: the columns wanted, the rows kept, with their weights.
///
/// # Errors
/// [`DataError::Io`] if the source cannot be read; [`DataError::Request`] and [`DataError::Expression`] if what is asked
/// makes no sense for these columns; the others if the data are wrong. Faults of cells are collected over all rows and
/// columns, the first ten shown.
pub fn read(source: &Source, request: &Request) -> Result<Table, DataError> {
    check_signs(request)?;
    let bytes = source.bytes()?;
    let (table, sha256) =
        beside(&bytes, || Work::open(source.shown(), sniff(source.shown(), &bytes)?, request)?.finish());
    Ok(Table { sha256, ..table? })
}

/// The work, and the digest of the bytes, made on another thread meanwhile where there is one and it pays.
fn beside<T>(bytes: &[u8], work: impl FnOnce() -> T) -> (T, String) {
    let digest = || Sha256::digest(bytes).iter().map(|b| format!("{b:02x}")).collect::<String>();
    if bytes.len() < 1 << 20 {
        return (work(), digest());
    }
    std::thread::scope(|scope| {
        let other = std::thread::Builder::new().spawn_scoped(scope, digest).ok();
        let done = work();
        (done, other.and_then(|t| t.join().ok()).unwrap_or_else(digest))
    })
}

/// The names in the header, in order, trimmed.
///
/// # Errors
/// [`DataError::Io`] if the source cannot be read, [`DataError::Unusable`] if it has no header.
pub fn names(source: &Source, request: &Request) -> Result<Vec<String>, DataError> {
    check_signs(request)?;
    let bytes = source.bytes()?;
    Ok(Sheet::open(source.shown(), sniff(source.shown(), &bytes)?, request)?.header.names)
}

fn check_signs(request: &Request) -> Result<(), DataError> {
    let refuse = |message: String| Err(DataError::Request(message));
    let (delimiter, decimal) = (request.delimiter, request.decimal);
    if !delimiter.is_ascii()
        || delimiter.is_ascii_alphanumeric()
        || matches!(delimiter, '"' | '\r' | '\n' | '\0' | '-' | '+')
    {
        return refuse(format!("the delimiter cannot be {delimiter:?}\n    usual ones: \",\" \";\" \"\\t\" \"|\""));
    }
    if !matches!(decimal, '.' | ',') {
        return refuse(format!("the decimal sign cannot be {decimal:?}\n    it is \".\" or \",\""));
    }
    if delimiter == decimal {
        return refuse(format!(
            "the delimiter and the decimal sign are both {decimal:?}\n    with decimal = \",\" the delimiter is usually \";\""
        ));
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::{names, read};
    use crate::data::{Blame, Column, DataError, OnMissing, Request, Sort, Source, Table, Values, Wanted};
    use proptest::collection::vec;
    use proptest::prelude::{Just, Strategy, prop_assert_eq, prop_oneof, proptest};

    fn request(wanted: &[(&str, Sort)]) -> Request {
        let wanted = wanted.iter().map(|(name, sort)| Wanted::new(*name, *sort)).collect();
        Request { wanted, ..Request::default() }
    }

    fn table(text: &str, request: &Request) -> Table {
        read(&Source::text("tiles.csv", text), request).unwrap()
    }

    fn error(text: &str, request: &Request) -> DataError {
        read(&Source::text("tiles.csv", text), request).unwrap_err()
    }

    #[test]
    fn columns_in_use_come_in_the_order_wanted() {
        let asked = request(&[("kiln", Sort::Either), ("flaws", Sort::Count)]);
        let t = table("\u{feff}flaws, area ,kiln\r\n3,x, south\r\n 0 ,y,\"north\"\r\n", &asked);
        assert_eq!(
            t.columns,
            [
                Column {
                    name: "kiln".into(),
                    values: Values::Category { codes: vec![1, 0], levels: vec!["north".into(), "south".into()] }
                },
                Column { name: "flaws".into(), values: Values::Number(vec![3.0, 0.0]) },
            ]
        );
        assert_eq!((t.rows, t.weights.clone(), t.lines.len(), t.file.as_str()), (2, None, 0, "tiles.csv"));
        assert_eq!((t.counts.read, t.counts.used), (2, 2));
        // The digest of the bytes as they are, from the published test value for "abc" (FIPS 180-4 example).
        let abc = read(&Source::text("f", "abc"), &Request::default()).unwrap_err();
        assert!(abc.to_string().contains("no rows"), "{abc}");
        let sum = table("abc\n1", &request(&[("abc", Sort::Number)])).sha256;
        assert_eq!(sum.len(), 64);
    }

    #[test]
    fn decimal_commas_and_other_delimiters() {
        let asked = Request { delimiter: ';', decimal: ',', ..request(&[("a", Sort::Number)]) };
        assert_eq!(table("a;b\n1,5;x\n", &asked).columns[0].values, Values::Number(vec![1.5]));
        let asked = Request { delimiter: '\t', ..request(&[("b", Sort::Number)]) };
        assert_eq!(table("a\tb\n\t2\n", &asked).columns[0].values, Values::Number(vec![2.0]));
        for (delimiter, decimal) in [(',', ','), ('"', '.'), ('\u{e9}', '.'), (',', ';'), ('a', '.')] {
            let asked = Request { delimiter, decimal, ..Request::default() };
            let wrong = error("a\n1\n", &asked);
            assert_eq!(wrong.blame(), Blame::Study, "{wrong}");
        }
    }

    #[test]
    fn odd_names_work() {
        let asked = request(&[
            ("soak time", Sort::Number),
            ("\u{7a91}", Sort::Number),
            ("2", Sort::Number),
            ("a,b", Sort::Number),
        ]);
        let t = table("soak time,\u{7a91},2,\"a,b\"\n1,2,3,4\n", &asked);
        assert_eq!(
            t.columns.iter().map(|c| c.values.clone()).collect::<Vec<_>>(),
            [1.0, 2.0, 3.0, 4.0].map(|x| Values::Number(vec![x]))
        );
        assert_eq!(names(&Source::text("f", " a ,\"b c\"\n"), &Request::default()).unwrap(), ["a", "b c"]);
    }

    #[test]
    fn what_is_no_table() {
        let asked = request(&[("a", Sort::Number)]);
        for (text, part) in [
            ("", "the file is empty"),
            ("\n\n", "no header"),
            ("a,b\n", "a header and no rows"),
            ("a,b\n\n  \n", "a header and no rows"),
            (",,,\n1,2,3,4\n", "holds no names"),
            ("b\n1\n", "no column is called a"),
            ("a,a\n1,2\n", "two columns are called a"),
        ] {
            let wrong = error(text, &asked);
            assert!(wrong.to_string().contains(part), "{text:?}: {wrong}");
            assert_eq!(wrong.blame(), Blame::Data);
        }
    }

    #[test]
    fn faults_of_all_rows_and_columns_are_collected() {
        let asked = request(&[("a", Sort::Number), ("b", Sort::Count)]);
        assert_eq!(
            error("a,b\r\n1,\"2\r\n\"\r\n\r\nx,-1\r\n1,2,3\r\n\"1,000\",0.5\r\n", &asked).to_string(),
            "tiles.csv, line 5, column a: found \"x\", expected a number\n\
             tiles.csv, line 5, column b: found \"-1\", expected a whole number, 0 or more\n\
             tiles.csv, line 6: found 3 cells, expected 2 as in the header\n\
             tiles.csv, line 7, column a: found \"1,000\", expected a number without thousands separators, 1000 (or is , the decimal sign?)\n\
             tiles.csv, line 7, column b: found \"0.5\", expected a whole number, 0 or more\n    \
             correct the cell, or list its text among the missing marks (data.missing) if it means missing\n    \
             every row needs as many cells as the header; quote cells that hold the delimiter\n    \
             if the file writes decimals with ,, say so: decimal = \",\""
        );
        let many = error(&format!("a,b\n{}", "x,y\n".repeat(20)), &asked);
        let DataError::Faults(faults) = &many else { panic!("{many}") };
        assert_eq!((faults.first.len(), faults.more, faults.first[9].line), (10, 30, 6));
        assert!(many.to_string().contains("and 30 more faults"), "{many}");
    }

    #[test]
    fn columns_not_in_use_may_hold_anything() {
        let t = table(
            &b"a,b\n1,\n2,x\n3,\"".iter().map(|b| *b as char).chain("\u{1}\"\n".chars()).collect::<String>(),
            &request(&[("a", Sort::Number)]),
        );
        assert_eq!(t.rows, 3);
        let mut bytes = b"a,b\n1,".to_vec();
        bytes.extend([0xff, b'\n']);
        assert!(read(&Source::text("f", bytes.clone()), &request(&[("a", Sort::Number)])).is_ok());
        for sort in [Sort::Number, Sort::Category] {
            let wrong = read(&Source::text("f", bytes.clone()), &request(&[("b", sort)])).unwrap_err();
            assert!(wrong.to_string().starts_with("f, line 2, column b: found"), "{wrong}");
            assert!(wrong.to_string().contains("UTF-8"), "{wrong}");
        }
    }

    #[test]
    fn numbers_or_labels_as_the_cells_turn_out() {
        let asked = Request { on_missing: OnMissing::Drop, ..request(&[("a", Sort::Either)]) };
        let values = |cells: &str| {
            table(&format!("a,b\n{}", cells.replace(' ', ",\n") + ",\n"), &asked).columns[0].values.clone()
        };
        assert_eq!(values("1 2.5"), Values::Number(vec![1.0, 2.5]));
        let Values::Category { levels, .. } = values("x 1 y") else { panic!("labels") };
        assert_eq!(levels, ["1", "x", "y"]);
        // Mostly numbers: a slip is more likely than a label.
        let wrong = error("a,b\n1,\n2,\nx,\n", &asked).to_string();
        assert!(wrong.contains("line 4, column a: found \"x\", expected a number"), "{wrong}");
        assert!(wrong.contains("under [data.category]: a = []"), "{wrong}");
        let labelled = Request { categories: vec![("a".into(), vec![])], ..asked };
        let t = table("a,b\n1,\n10,\n2,\n", &labelled);
        let Values::Category { levels, codes } = &t.columns[0].values else { panic!("labels") };
        assert_eq!((levels.clone(), codes.clone()), (vec!["1".into(), "2".into(), "10".into()], vec![0, 2, 1]));
    }

    #[test]
    fn ends_of_intervals() {
        let asked = Request {
            on_missing: OnMissing::Stop,
            missing: vec!["".into(), "NA".into()],
            pairs: vec![crate::data::Pair::Ends { lower: "low".into(), upper: "high".into() }],
            ..request(&[("low", Sort::LowerEnd), ("high", Sort::UpperEnd), ("low", Sort::Nonnegative)])
        };
        let t = table("low,high\n,1\nNA,2\n-inf,3\n1,\n2,inf\n3,3\n", &asked);
        let inf = f64::INFINITY;
        assert_eq!(t.columns[0].values, Values::Number(vec![-inf, -inf, -inf, 1.0, 2.0, 3.0]));
        assert_eq!(t.columns[1].values, Values::Number(vec![1.0, 2.0, 3.0, inf, inf, 3.0]));
        let wrong = error("low,high\n,\n2,1\ninf,3\n-1,2\nx,1\n", &asked).to_string();
        for part in [
            "line 2, column low: found \"\" and \"\" in column high: both ends are open",
            "line 3, column low: found \"2\", expected at most the upper end, \"1\" in column high",
            "line 4, column low: found \"inf\", expected a number, or an open end (empty or -inf)",
            "line 5, column low: found \"-1\", expected a number, 0 or more",
            "line 6, column low: found \"x\", expected a number",
        ] {
            assert!(wrong.contains(part), "{part}\n{wrong}");
        }
    }

    #[test]
    fn counts_out_of_trials() {
        let pairs = vec![crate::data::Pair::AtMost { count: "k".into(), trials: "n".into() }];
        let asked = Request { pairs, ..request(&[("k", Sort::Count)]) };
        assert_eq!(table("k,n\n1,2\n2,2\n", &asked).columns.len(), 1);
        let wrong = error("k,n\n1,2\n3,2\n", &asked).to_string();
        assert_eq!(wrong, "tiles.csv, line 3, column k: found \"3\", expected at most the trials, \"2\" in column n");
    }

    /// A cell as text, and how it may be written in a file.
    fn written() -> impl Strategy<Value = (String, String)> {
        let quoted = |s: String| (s.trim().to_owned(), format!("\"{}\"", s.replace('"', "\"\"")));
        prop_oneof![
            "[a-z]{1,6}".prop_map(|s| (s.clone(), s)),
            "[a-z]{1,6}".prop_map(|s| (s.clone(), format!("  {s} "))),
            "[a-z][ -~\u{e0}-\u{ff}\n\r]{0,8}".prop_map(quoted),
            "[a-z]{1,3}".prop_map(quoted),
        ]
    }

    proptest! {
        #[test]
        fn tables_read_back_as_written(
            rows in vec((vec(written(), 2..=2), -1e6f64..1e6, 0usize..3), 1..30),
            ends in prop_oneof![Just("\n"), Just("\r\n")],
            blanks in vec(0usize..3, 30..=30),
        ) {
            let mut text = format!("label,x,other{ends}");
            let mut lines = Vec::new();
            for ((cells, x, style), blank) in rows.iter().zip(&blanks) {
                text.push_str(&ends.repeat(*blank));
                lines.push(text.matches('\n').count() + 1);
                let number = match style { 0 => format!("{x}"), 1 => format!(" {x:e} "), _ => format!("\"{x}\"") };
                text.push_str(&format!("{},{number},{}{ends}", cells[0].1, cells[1].1));
            }
            let t = table(&text, &request(&[("x", Sort::Number), ("label", Sort::Category)]));
            prop_assert_eq!(&t.columns[0].values, &Values::Number(rows.iter().map(|r| r.1).collect()));
            let Values::Category { codes, levels } = &t.columns[1].values else { panic!("labels were asked for") };
            let labels: Vec<&str> = codes.iter().map(|c| levels[*c as usize].as_str()).collect();
            prop_assert_eq!(labels, rows.iter().map(|r| r.0[0].0.as_str()).collect::<Vec<_>>());
            prop_assert_eq!((0..t.rows).map(|r| t.line(r)).collect::<Vec<_>>(), lines);
        }

        #[test]
        fn any_bytes_give_a_table_or_an_error(bytes in vec(prop_oneof![Just(b','), Just(b'\n'), Just(b'"'), Just(b'\r'), Just(b'1'), 0u8..=255], 0..60)) {
            let mut all = b"a,b\n".to_vec();
            all.extend(bytes);
            for sort in [Sort::Either, Sort::Number, Sort::LowerEnd] {
                if let Err(wrong) = read(&Source::text("f", all.clone()), &request(&[("a", sort), ("b", Sort::Category)])) {
                    prop_assert_eq!(wrong.to_string().is_empty(), false);
                }
            }
        }
    }
}
