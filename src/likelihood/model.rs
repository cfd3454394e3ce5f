//! The model as the user states it, before it meets the data. Texts are kept as written; `place` in errors is the
//! dotted key of the study they came from (`model.log_density`, `model.mean.curve`, `model.let.k`).

use crate::math::Range;

/// A model statement.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Model {
    /// Name of the family: one of `guyline families`.
    pub family: String,
    /// What is modelled.
    pub response: Response,
    /// Column that multiplies the mean (poisson).
    pub exposure: Option<String>,
    /// Number of trials (binomial): a column or a number; 1 when absent.
    pub trials: Option<Amount>,
    /// Successes among what is drawn from (hypergeometric): a column or a number.
    pub successes: Option<Amount>,
    /// Failures among what is drawn from (hypergeometric): a column or a number.
    pub failures: Option<Amount>,
    /// Nothing at or below this could be recorded: a column or a number.
    pub above: Option<Amount>,
    /// Nothing at or above this could be recorded: a column or a number.
    pub below: Option<Amount>,
    /// `[model.support]`: which values the variables of a custom density take.
    pub support: Vec<(String, Values)>,
    /// Marks rows whose response was seen; the others are right-censored.
    pub event: Option<Event>,
    /// Column whose levels each get a set of parameters.
    pub per: Option<String>,
    /// Settings by row parameter (`mean`, `rate`, `share`), or by free parameter of a curve or a custom density, in file order.
    pub parameters: Vec<Setting>,
    /// `[model.let]`: named pieces, in order.
    pub lets: Vec<(String, String)>,
    /// Components of a mixture, in order.
    pub components: Vec<Component>,
    /// Log density of `custom`.
    pub log_density: Option<String>,
}

/// What is modelled.
#[derive(Debug, Clone, PartialEq, Default)]
pub enum Response {
    /// None (a custom density may name its columns itself).
    #[default]
    None,
    /// One column of numbers (labels for categorical).
    Column(String),
    /// Two columns, the ends of an interval in which the response fell.
    Ends {
        /// Column of lower ends.
        lower: String,
        /// Column of upper ends.
        upper: String,
    },
    /// Several columns: labels that make the cells of a table, columns of shares, of numbers.
    Several(Vec<String>),
}

/// A column or a number.
#[derive(Debug, Clone, PartialEq)]
pub enum Amount {
    /// A column of the table.
    Column(String),
    /// The same number for every row.
    Number(f64),
}

/// The values that a variable of a custom density takes.
#[derive(Debug, Clone, PartialEq)]
pub enum Values {
    /// These.
    List(Vec<f64>),
    /// Whole numbers from the first to the second, which may be infinite.
    Whole(f64, f64),
    /// All numbers between two ends.
    Interval(f64, f64),
}

/// Which rows were seen to happen.
#[derive(Debug, Clone, PartialEq)]
pub struct Event {
    /// Column.
    pub column: String,
    /// Label that means seen; `None`: the column holds 1 and 0.
    pub seen: Option<String>,
}

/// A component of a mixture.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Component {
    /// Its name: parameters are `NAME.mean`, `share.NAME`.
    pub name: String,
    /// Its family.
    pub family: String,
    /// Settings of its parameters.
    pub parameters: Vec<Setting>,
    /// Number of trials (binomial components).
    pub trials: Option<Amount>,
    /// Column that multiplies the mean (poisson components).
    pub exposure: Option<String>,
}

/// How one row parameter is made, and what is said about its pieces.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Setting {
    /// Row parameter or free parameter. With `per`, `NAME` speaks of all levels, `LEVEL.NAME` of one.
    pub name: String,
    /// Constant, linear in terms, or a curve.
    pub form: Form,
    /// With `per`: one for all levels.
    pub shared: bool,
    /// Starting values; key `None` speaks of the parameter itself, else of the coefficient or level so named
    /// (`soak`, `kiln.middle`, `kiln.middle:soak`, `intercept`; `north` for shares).
    pub start: Vec<(Option<String>, f64)>,
    /// Known values, keyed likewise.
    pub known: Vec<(Option<String>, f64)>,
    /// Ranges, keyed likewise.
    pub range: Vec<(Option<String>, Range)>,
}

/// How a row parameter is made.
#[derive(Debug, Clone, PartialEq, Default)]
pub enum Form {
    /// One number.
    #[default]
    Plain,
    /// A linear predictor on a link scale.
    Terms(Terms),
    /// An expression of columns, lets and free parameters, on the natural scale.
    Curve(String),
}

/// A linear predictor.
#[derive(Debug, Clone, PartialEq)]
pub struct Terms {
    /// Each term is a product of one or more columns.
    pub terms: Vec<Vec<String>>,
    /// Name of the link (`identity`, `log`, `logit`, `probit`, `complementary_log_log`); `None`: the family's first.
    pub link: Option<String>,
    /// Whether there is an intercept.
    pub intercept: bool,
    /// `true`: a coefficient for each level; `false`: the first level left out.
    pub full: bool,
    /// Column or expression added to the predictor.
    pub offset: Option<String>,
}
