//! Prints what the engine reaches, beside the figures to reach: `study`.
#![expect(clippy::print_stdout, reason = "printing is the program's purpose")]

mod recorded;

use std::error::Error;

fn main() -> Result<(), Box<dyn Error>> {
    recorded::print(40)
}
