//! The command line, as clap reads it. Values are checked where the study's own are, so that both get the same messages.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

use crate::study::{Given, Overlay};

// Long texts are broken by hand: clap would need one more crate to do it.

const ABOUT: &str = "\
Guyline maximises a likelihood under equality restrictions and answers three questions: what the
estimates are with all restrictions imposed, how hard the data pull at each restriction and in
which direction, and whether the data accept them. Every answer carries a certificate that says
why it may be believed.";

const STATUSES: &str = "\
Exit status:
  0  done
  1  the gate closed
  2  the command line or the study is wrong
  3  the data are wrong
  4  no trustworthy restricted maximum, or a gate without a p
  5  a file could not be read or written
  130  interrupted";

const FIT: &str = "\
Fits the study's model to its data under all restrictions, maintained and tested. Prints the
estimates, what each restriction pulls, whether the data accept the restrictions (score,
likelihood-ratio and Wald test), and the certificate. A study can be a file, options alone, or a
file with options over it: options go before --with, --with before the file.";

const FIT_EXAMPLES: &str = "\
Examples:
  guyline fit flaws.toml
  guyline fit flaws.toml --drop same_slope --tested 'flat: rate.soak = 0'
  guyline fit --data flaws.csv --family poisson --response flaws --exposure area \\
      --per kiln --tested 'north.rate = 2 * south.rate' --gate 0.01";

const CHECK: &str = "\
Reads the study and its data and says in words what would be fitted: the rows, each column and
its use, each parameter with its meaning, range and starting value, each restriction written out.
Looks for the usual mistakes. Fits nothing.";

const COMPLETIONS: &str = "\
Writes a script to standard output that completes guyline's commands and options in a shell. Put
it where the shell looks for such scripts.";

/// The whole command line.
#[derive(Debug, Parser)]
#[command(
    name = "guyline",
    bin_name = "guyline",
    version,
    about = "Maximum likelihood under equality restrictions: estimates, multipliers, tests, and why to believe them",
    long_about = ABOUT,
    after_help = STATUSES,
    disable_help_subcommand = true
)]
pub struct Arguments {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// The commands.
#[derive(Debug, Subcommand)]
#[allow(clippy::large_enum_variant, reason = "one value a process")]
pub enum Command {
    /// Fit under the restrictions: estimates, multipliers, tests, certificate
    #[command(long_about = FIT, after_help = FIT_EXAMPLES)]
    Fit(Box<Fit>),
    /// Say in words what a study would fit, and look for the usual mistakes; fits nothing
    #[command(long_about = CHECK)]
    Check(Box<Check>),
    /// List the families of likelihoods, or describe one
    Families(Families),
    /// Write completions for a shell to standard output
    #[command(long_about = COMPLETIONS)]
    Completions {
        /// The shell
        shell: clap_complete::Shell,
    },
}

/// The options that speak about the study.
#[derive(Debug, Args, Default)]
pub struct StudyOptions {
    /// The study, a TOML file; without it the options below make one
    pub study: Option<PathBuf>,
    /// CSV file of the data; - reads standard input
    #[arg(long, value_name = "FILE", help_heading = "The study's keys", allow_hyphen_values = true)]
    pub data: Option<String>,
    /// Family of the likelihood; guyline families lists them
    #[arg(long, value_name = "NAME", help_heading = "The study's keys")]
    pub family: Option<String>,
    /// Column that is modelled
    #[arg(long, value_name = "COLUMN", help_heading = "The study's keys")]
    pub response: Option<String>,
    /// Column of lower ends, where the response is known to lie between two ends
    #[arg(long, value_name = "COLUMN", help_heading = "The study's keys")]
    pub response_lower: Option<String>,
    /// Column of upper ends
    #[arg(long, value_name = "COLUMN", help_heading = "The study's keys")]
    pub response_upper: Option<String>,
    /// Column of frequency weights
    #[arg(long, value_name = "COLUMN", help_heading = "The study's keys")]
    pub weight: Option<String>,
    /// Column that multiplies the mean
    #[arg(long, value_name = "COLUMN", help_heading = "The study's keys")]
    pub exposure: Option<String>,
    /// Number of trials: a column or a number
    #[arg(long, value_name = "COLUMN|N", help_heading = "The study's keys")]
    pub trials: Option<String>,
    /// Column that is 1 where the response was seen to happen, 0 where it was only longer than that
    #[arg(long, value_name = "COLUMN", help_heading = "The study's keys")]
    pub event: Option<String>,
    /// Column whose levels each get their own set of parameters
    #[arg(long, value_name = "COLUMN", help_heading = "The study's keys")]
    pub per: Option<String>,
    /// Set any key of the study: --with 'model.rate.terms=["kiln"]' (repeatable)
    #[arg(long, value_name = "KEY=VALUE", help_heading = "The study's keys", allow_hyphen_values = true)]
    pub with: Vec<String>,
    /// Add a restriction to be tested (repeatable)
    #[arg(long, value_name = "[NAME: ]EQUATION", help_heading = "Restrictions", allow_hyphen_values = true)]
    pub tested: Vec<String>,
    /// Add a restriction that is always imposed and never tested (repeatable)
    #[arg(long, value_name = "[NAME: ]EQUATION", help_heading = "Restrictions", allow_hyphen_values = true)]
    pub maintained: Vec<String>,
    /// Leave out a restriction of the study (repeatable)
    #[arg(long, value_name = "NAME", help_heading = "Restrictions")]
    pub drop: Vec<String>,
    /// Information for standard errors and tests: expected, observed, outer, robust
    #[arg(long, value_name = "KIND", help_heading = "Inference")]
    pub information: Option<String>,
}

/// `guyline fit`.
#[derive(Debug, Args)]
pub struct Fit {
    #[command(flatten)]
    pub study: StudyOptions,
    /// Tests wanted, of score, lr and wald [default: all three]
    #[arg(long, value_name = "LIST", help_heading = "Inference")]
    pub tests: Option<String>,
    /// Coverage of the intervals [default: 0.95]
    #[arg(long, value_name = "FRACTION", help_heading = "Inference", allow_hyphen_values = true)]
    pub confidence: Option<String>,
    /// Starting points [default: 1 where there can be one maximum only, else 20]
    #[arg(long, value_name = "N", help_heading = "Search", allow_hyphen_values = true)]
    pub starts: Option<String>,
    /// Seed of the spread starting points [default: 1]
    #[arg(long, value_name = "S", help_heading = "Search", allow_hyphen_values = true)]
    pub seed: Option<String>,
    /// Write the iterations of the restricted fit as CSV
    #[arg(long, value_name = "FILE.csv", help_heading = "Search")]
    pub trace: Option<String>,
    /// Form of the answer: text, json, csv [default: text]
    #[arg(long, value_name = "FORM", help_heading = "Output")]
    pub format: Option<String>,
    /// Write the answer to a file, whole or not at all [default: standard output]
    #[arg(long, value_name = "FILE", help_heading = "Output")]
    pub output: Option<String>,
    /// Keep back messages that are no errors
    #[arg(long, help_heading = "Output")]
    pub quiet: bool,
    /// Threads [default: as many as the machine has]; the answer does not depend on it
    #[arg(long, value_name = "N", help_heading = "Machine", allow_hyphen_values = true)]
    pub threads: Option<String>,
    /// Tell the seconds spent reading, preparing and fitting, and the passes over the data
    #[arg(long, help_heading = "Machine")]
    pub timings: bool,
    /// End with status 1 when the joint score p is below ALPHA
    #[arg(long, value_name = "ALPHA", help_heading = "Output", allow_hyphen_values = true)]
    pub gate: Option<String>,
}

/// `guyline check`.
#[derive(Debug, Args)]
pub struct Check {
    #[command(flatten)]
    pub study: StudyOptions,
}

/// `guyline families`.
#[derive(Debug, Args)]
pub struct Families {
    /// One family to describe
    pub name: Option<String>,
    /// Form of the list
    #[arg(long, value_enum, default_value_t = ListFormat::Text)]
    pub format: ListFormat,
}

/// Forms of a list.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum ListFormat {
    /// Prose
    Text,
    /// JSON
    Json,
}

impl StudyOptions {
    /// What the options lay over the study.
    pub fn overlay(&self) -> Overlay {
        let keys = [
            ("--data", "data.file", &self.data),
            ("--family", "model.family", &self.family),
            ("--response", "model.response", &self.response),
            ("--response-lower", "model.response_lower", &self.response_lower),
            ("--response-upper", "model.response_upper", &self.response_upper),
            ("--weight", "data.weight", &self.weight),
            ("--exposure", "model.exposure", &self.exposure),
            ("--trials", "model.trials", &self.trials),
            ("--event", "model.event", &self.event),
            ("--per", "model.per", &self.per),
            ("--information", "options.information", &self.information),
        ];
        Overlay {
            keys: given(&keys),
            with: self.with.clone(),
            maintained: self.maintained.clone(),
            tested: self.tested.clone(),
            drop: self.drop.clone(),
        }
    }
}

impl Fit {
    /// What the options lay over the study.
    pub fn overlay(&self) -> Overlay {
        let truth = |flag: bool| flag.then(|| "true".to_owned());
        let keys = [
            ("--tests", "options.tests", &self.tests),
            ("--confidence", "options.confidence", &self.confidence),
            ("--starts", "options.starts", &self.starts),
            ("--seed", "options.seed", &self.seed),
            ("--trace", "options.trace", &self.trace),
            ("--format", "options.format", &self.format),
            ("--output", "options.output", &self.output),
            ("--quiet", "options.quiet", &truth(self.quiet)),
            ("--threads", "options.threads", &self.threads),
            ("--timings", "options.timings", &truth(self.timings)),
            ("--gate", "options.gate", &self.gate),
        ];
        let mut overlay = self.study.overlay();
        overlay.keys.extend(given(&keys));
        overlay
    }
}

fn given(keys: &[(&'static str, &'static str, &Option<String>)]) -> Vec<Given> {
    keys.iter().filter_map(|(option, key, value)| Some(Given { option, key, value: Option::clone(value)? })).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    #[test]
    fn clap_finds_no_fault_in_the_definition() {
        Arguments::command().debug_assert();
    }

    #[test]
    fn every_key_option_is_told_to_the_study() {
        let keys = crate::study::with::KEYS;
        let mut line = vec!["guyline", "fit"];
        for (option, _) in keys {
            line.extend([*option, "x"]);
        }
        let Command::Fit(fit) = Arguments::try_parse_from(line).unwrap().command else { panic!() };
        let laid: Vec<_> = fit.overlay().keys.iter().map(|g| (g.option, g.key)).collect();
        for pair in keys {
            assert!(laid.contains(pair), "{pair:?}");
        }
        // Every option of [options] is an option of the command, except the repeatable drop.
        let command = Arguments::command();
        let fit = command.find_subcommand("fit").unwrap();
        for key in crate::study::options::KEYS {
            let long = key.replace('_', "-");
            assert!(fit.get_arguments().any(|a| a.get_long() == Some(long.as_str())), "{key}");
        }
    }
}
