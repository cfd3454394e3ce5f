//! What is to be read, worked out from the request and the header before any row is looked at.

use super::derived::{Formula, Use};
use super::error::{DataError, clip, key};
use super::header::Header;
use super::request::{Pair, Request, Sort};
use super::scan::{Form, Origin};
use crate::expr::{ExprError, Fault, nearest};

/// What a name stands for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Place {
    /// A column of the file.
    File(usize),
    /// The label that unfolding makes.
    Label,
    /// The value that unfolding makes.
    Value,
    /// A derived column.
    Derived(usize),
}

/// What a slot holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Kind {
    /// Cells in this form.
    Fixed(Form),
    /// Numbers or labels, as the cells turn out.
    Open,
}

/// One column in one form. A column may stand in two slots: as labels for the model, as numbers in a filter.
#[derive(Debug, Clone)]
pub(super) struct Slot {
    pub name: String,
    pub place: Place,
    pub kind: Kind,
    /// Levels listed beforehand; none: those found.
    pub levels: Vec<String>,
    /// What the values must be.
    pub sorts: Vec<Sort>,
}

/// Everything in use.
#[derive(Debug, Default)]
pub(super) struct Plan {
    pub slots: Vec<Slot>,
    /// Slots of the columns that the table will hold, in the order wanted.
    pub outputs: Vec<usize>,
    pub weight: Option<usize>,
    /// Derived columns in use, in order: their slots, their formulas, and the slots of their inputs.
    pub derived: Vec<Step>,
    pub only: Option<Step>,
    /// Slots of the pairs, as asked.
    pub pairs: Vec<(usize, usize)>,
    /// Columns of the file that unfold.
    pub unfolded: Vec<usize>,
}

/// An expression with its inputs by name.
#[derive(Debug)]
pub(super) struct Step {
    pub formula: Formula,
    pub inputs: Vec<(String, usize)>,
    /// The place it fills; the filter fills none.
    pub index: usize,
}

impl Plan {
    /// How many rows a record gives.
    pub fn rows_a_record(&self) -> usize {
        self.unfolded.len().max(1)
    }

    /// Where the cells of a slot stand in the file.
    pub fn origin(&self, slot: usize) -> Option<Origin> {
        match self.slots[slot].place {
            Place::File(i) => Some(Origin::Column(i)),
            Place::Value => Some(Origin::Columns(self.unfolded.clone())),
            Place::Label | Place::Derived(_) => None,
        }
    }

    /// Resolves all names.
    pub fn new(request: &Request, header: &Header) -> Result<Plan, DataError> {
        let mut maker = Maker { request, header, formulas: Vec::new(), plan: Plan::default() };
        maker.check()?;
        maker.model_columns()?;
        maker.expressions()?;
        Ok(maker.plan)
    }
}

struct Maker<'a> {
    request: &'a Request,
    header: &'a Header,
    /// One a derived column.
    formulas: Vec<Formula>,
    plan: Plan,
}

fn refuse<T>(message: String) -> Result<T, DataError> {
    Err(DataError::Request(message))
}

impl Maker<'_> {
    /// Signs, names that clash, lists with repeats; reads every expression.
    fn check(&mut self) -> Result<(), DataError> {
        let request = self.request;
        let (delimiter, decimal) = (request.delimiter, request.decimal);
        let mut taken: Vec<(&str, &str)> = Vec::new();
        if let Some(unfold) = &request.unfold {
            if unfold.columns.is_empty() {
                return refuse(
                    "data.unfold lists no columns\n    name the count columns: columns = [\"a\", \"b\"]".into(),
                );
            }
            if let Some(twice) = repeated(&unfold.columns) {
                return refuse(format!("data.unfold lists the column {} twice", clip(twice)));
            }
            for name in &unfold.columns {
                let at = self.header.find(name)?;
                self.plan.unfolded.push(at);
            }
            taken.push(("data.unfold.label", &unfold.label));
            taken.push(("data.unfold.value", &unfold.value));
        }
        taken.extend(request.derive.iter().map(|(name, _)| ("data.derive", name.as_str())));
        for (i, (maker, name)) in taken.iter().enumerate() {
            if name.trim().is_empty() {
                return refuse(format!("{maker} makes a column without a name"));
            }
            if let Some((other, _)) = taken[..i].iter().find(|(_, n)| n == name) {
                return refuse(format!(
                    "two columns are called {}: one made by {other}, one by {maker}\n    give one of them another name",
                    clip(name)
                ));
            }
            if let Some(at) = self.header.position(name) {
                return refuse(format!(
                    "two columns are called {}: one made by {maker}, and column {} of {}\n    give the one that is made another name",
                    clip(name),
                    at + 1,
                    self.header.file
                ));
            }
        }
        for (i, (name, levels)) in request.categories.iter().enumerate() {
            self.place(name)?;
            if request.categories[..i].iter().any(|(n, _)| n == name) {
                return refuse(format!("data.category lists {} twice", clip(name)));
            }
            if let Some(twice) = repeated(levels) {
                return refuse(format!("data.category.{} lists the level {} twice", key(name), clip(twice)));
            }
        }
        for (i, (name, text)) in request.derive.iter().enumerate() {
            let formula = Formula::parse(format!("data.derive.{}", key(name)), text, false)?;
            for (used, (_, span)) in &formula.uses {
                let later = |(n, _): &(String, String)| n == used;
                if let Some(j) = request.derive.iter().position(later).filter(|j| *j >= i) {
                    let what = if i == j { "is made of itself" } else { "is derived further down" };
                    return Err(formula.fault(ExprError {
                        span: *span,
                        fault: Fault::Sort(format!("{} {what}", clip(used))),
                        advice: Some("a derived column may use columns of the file and those derived above it".into()),
                    }));
                }
                self.used_place(&formula, used)?;
            }
            self.formulas.push(formula);
        }
        debug_assert!(delimiter.is_ascii() && decimal.is_ascii(), "checked before the header is read");
        Ok(())
    }

    /// What a name stands for, if anything.
    fn known(&self, name: &str) -> Option<Place> {
        if let Some(i) = self.request.derive.iter().position(|(n, _)| n == name) {
            return Some(Place::Derived(i));
        }
        match &self.request.unfold {
            Some(u) if u.label == name => return Some(Place::Label),
            Some(u) if u.value == name => return Some(Place::Value),
            _ => {}
        }
        self.header.position(name).map(Place::File)
    }

    fn place(&self, name: &str) -> Result<Place, DataError> {
        match self.known(name) {
            Some(Place::File(_)) | None => self.header.find(name).map(Place::File),
            Some(place) => Ok(place),
        }
    }

    /// The same for a name in an expression, whose place in it can be shown.
    fn used_place(&self, formula: &Formula, name: &str) -> Result<Place, DataError> {
        if self.known(name).is_some() {
            return self.place(name);
        }
        let derived = self.request.derive.iter().map(|(n, _)| n.as_str());
        let unfolded = self.request.unfold.iter().flat_map(|u| [u.label.as_str(), u.value.as_str()]);
        let names = self.header.names.iter().map(String::as_str).chain(derived).chain(unfolded);
        let span = formula.uses.get(name).map(|(_, span)| *span).unwrap_or_default();
        let near = nearest(name, names).map(|n| format!("nearest name: {}", clip(n)));
        let there = || format!("columns there are: {}", self.header.listed());
        Err(formula.fault(ExprError {
            span,
            fault: Fault::Unknown("column", clip(name)),
            advice: Some(near.unwrap_or_else(there)),
        }))
    }

    fn declared(&self, name: &str) -> Option<&[String]> {
        self.request.categories.iter().find(|(n, _)| n == name).map(|(_, levels)| levels.as_slice())
    }

    /// The slot of this column in this form, made if there is none.
    fn slot(&mut self, name: &str, place: Place, kind: Kind) -> usize {
        if let Some(i) = self.plan.slots.iter().position(|s| s.place == place && s.kind == kind) {
            return i;
        }
        let levels = match (kind, place, &self.request.unfold) {
            (Kind::Fixed(Form::Label), Place::Label, Some(u))
                if self.declared(name).is_none_or(<[String]>::is_empty) =>
            {
                u.columns.clone()
            }
            (Kind::Fixed(Form::Label), ..) => self.declared(name).unwrap_or(&[]).to_vec(),
            _ => Vec::new(),
        };
        self.plan.slots.push(Slot { name: name.to_owned(), place, kind, levels, sorts: Vec::new() });
        self.plan.slots.len() - 1
    }

    /// The columns wanted, the weight and the pairs.
    fn model_columns(&mut self) -> Result<(), DataError> {
        let request = self.request;
        let weight = request.weight.as_deref().or_else(|| {
            let value = request.unfold.as_ref().map(|u| u.value.as_str())?;
            (!request.wanted.iter().any(|w| w.name == value)).then_some(value)
        });
        let mut demands: Vec<(&str, Sort)> = request.wanted.iter().map(|w| (w.name.as_str(), w.sort)).collect();
        demands.extend(weight.map(|name| (name, Sort::Nonnegative)));
        for pair in &request.pairs {
            match pair {
                Pair::Ends { lower, upper } => demands.extend([(&**lower, Sort::LowerEnd), (&**upper, Sort::UpperEnd)]),
                Pair::AtMost { count, trials } => demands.extend([(&**count, Sort::Count), (&**trials, Sort::Count)]),
            }
        }
        let mut made: Vec<(Place, usize)> = Vec::new();
        for (name, _) in &demands {
            let place = self.place(name)?;
            if made.iter().any(|(p, _)| *p == place) {
                continue;
            }
            let sorts: Vec<Sort> = demands.iter().filter(|(n, _)| n == name).map(|(_, sort)| *sort).collect();
            let kind = self.kind(name, place, &sorts)?;
            let slot = self.slot(name, place, kind);
            self.plan.slots[slot].sorts = sorts;
            made.push((place, slot));
        }
        let slot_of = |maker: &Self, name: &str| -> Result<usize, DataError> {
            let place = maker.place(name)?;
            Ok(made.iter().find(|(p, _)| *p == place).map_or(0, |(_, slot)| *slot))
        };
        for wanted in &request.wanted {
            let slot = slot_of(self, &wanted.name)?;
            if !self.plan.outputs.contains(&slot) {
                self.plan.outputs.push(slot);
            }
        }
        if let Some(name) = weight {
            self.plan.weight = Some(slot_of(self, name)?);
        }
        for pair in &request.pairs {
            let (a, b) = match pair {
                Pair::Ends { lower, upper } => (lower, upper),
                Pair::AtMost { count, trials } => (count, trials),
            };
            let slots = (slot_of(self, a)?, slot_of(self, b)?);
            self.plan.pairs.push(slots);
        }
        Ok(())
    }

    /// The form in which the model uses a column.
    fn kind(&self, name: &str, place: Place, sorts: &[Sort]) -> Result<Kind, DataError> {
        let is_number = |s: &&Sort| !matches!(s, Sort::Category | Sort::Either);
        let number = sorts.iter().find(is_number);
        let labels = sorts.contains(&Sort::Category) || place == Place::Label;
        match number {
            Some(sort) if self.declared(name).is_some() => refuse(format!(
                "{} is listed under data.category, but where it is used it must hold {}\n    take it off data.category, or make a copy under data.derive before",
                clip(name),
                sort.words()
            )),
            Some(sort) if labels => refuse(format!(
                "{} is used as a category in one place, and in another it must hold {}\n    use another column in one of them",
                clip(name),
                sort.words()
            )),
            Some(_) => {
                let (lower, upper) = (sorts.contains(&Sort::LowerEnd), sorts.contains(&Sort::UpperEnd));
                Ok(Kind::Fixed(match (lower, upper) {
                    (true, false) => Form::Lower,
                    (false, true) => Form::Upper,
                    _ => Form::Number,
                }))
            }
            None if labels || self.declared(name).is_some() => Ok(Kind::Fixed(Form::Label)),
            None if place == Place::Value || matches!(place, Place::Derived(_)) => Ok(Kind::Fixed(Form::Number)),
            None => Ok(Kind::Open),
        }
    }

    /// The filter, the derived columns in use, and the columns those use.
    fn expressions(&mut self) -> Result<(), DataError> {
        if let Some(text) = &self.request.only {
            let formula = Formula::parse("data.only".into(), text, true)?;
            let inputs = self.inputs(&formula)?;
            self.plan.only = Some(Step { formula, inputs, index: usize::MAX });
        }
        // A derived column uses earlier ones only, so going backwards meets every use before the column itself.
        for (index, formula) in std::mem::take(&mut self.formulas).into_iter().enumerate().rev() {
            if self.plan.slots.iter().any(|s| s.place == Place::Derived(index)) {
                let inputs = self.inputs(&formula)?;
                self.plan.derived.push(Step { formula, inputs, index });
            }
        }
        self.plan.derived.reverse();
        Ok(())
    }

    fn inputs(&mut self, formula: &Formula) -> Result<Vec<(String, usize)>, DataError> {
        let mut inputs = Vec::new();
        for (name, (used, span)) in &formula.uses {
            let place = self.used_place(formula, name)?;
            let wrong = |what: String, advice: String| {
                Err(formula.fault(ExprError { span: *span, fault: Fault::Sort(what), advice: Some(advice) }))
            };
            let labels = self.declared(name).is_some() || place == Place::Label;
            let kind = match used {
                Use::Number if labels => {
                    return wrong(
                        format!("{} is a category and has no value as a number", clip(name)),
                        format!("compare it with a label: {} = 'label'", clip(name)),
                    );
                }
                Use::Label if matches!(place, Place::Derived(_) | Place::Value) => {
                    return wrong(
                        format!("{} holds numbers, not labels", clip(name)),
                        "compare it with a number, without quotes".into(),
                    );
                }
                Use::Number => self.number_kind(place),
                Use::Label => Kind::Fixed(Form::Label),
                Use::Either => match self.plan.slots.iter().find(|s| s.place == place) {
                    Some(slot) => slot.kind,
                    None if labels => Kind::Fixed(Form::Label),
                    None if matches!(place, Place::Derived(_) | Place::Value) => Kind::Fixed(Form::Number),
                    None => Kind::Open,
                },
            };
            inputs.push((name.clone(), self.slot(name, place, kind)));
        }
        Ok(inputs)
    }

    /// Numbers of a column: those of the model where it uses numbers too.
    fn number_kind(&self, place: Place) -> Kind {
        let is_number =
            |s: &&Slot| s.place == place && matches!(s.kind, Kind::Fixed(Form::Number | Form::Lower | Form::Upper));
        self.plan.slots.iter().find(is_number).map_or(Kind::Fixed(Form::Number), |s| s.kind)
    }
}

fn repeated(names: &[String]) -> Option<&str> {
    names.iter().enumerate().find(|(i, n)| names[..*i].contains(n)).map(|(_, n)| n.as_str())
}
