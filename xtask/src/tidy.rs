//! `cargo xtask tidy`: rules of the source tree that no lint knows.

use std::fs;
use std::path::{Path, PathBuf};

use anyhow::{Result, bail};

use crate::command::root;

/// The workspace's packages that hold source, each with those of ours it may depend on.
const PACKAGES: [(&str, &[&str]); 5] = [
    ("analysis", &[]),
    ("cli", &["plumbtone-analysis"]),
    ("plugin", &["plumbtone-analysis"]),
    ("tests", &["plumbtone-analysis", "plumbtone-cli", "plumbtone-plugin"]),
    ("xtask", &[]),
];
/// Most lines of a source file.
const LINES_MAX: usize = 600;
/// Folders that absolute paths of a developer's machine begin with.
const ABSOLUTE: [&str; 5] = ["home", "root", "Users", "work", "tmp"];
/// Words that no name of a file or folder may consist of.
const NAMES_OF_NOTHING: [&str; 4] = ["utils", "util", "common", "mod"];

pub(crate) fn run() -> Result<()> {
    let findings = check(&root())?;
    if !findings.is_empty() {
        bail!("the source tree is not tidy:\n  {}", findings.join("\n  "));
    }
    println!(
        "tidy: every source file has a header and at most {LINES_MAX} lines, dependencies run one way"
    );
    Ok(())
}

/// All that is wrong in a tree.
fn check(root: &Path) -> Result<Vec<String>> {
    let mut findings = Vec::new();
    for (package, allowed) in PACKAGES {
        let folder = root.join(package);
        if !folder.exists() {
            continue;
        }
        let manifest = fs::read_to_string(folder.join("Cargo.toml"))?;
        findings.extend(manifest_findings(package, &manifest, allowed));
        for file in sources(&folder)? {
            let text = fs::read_to_string(&file)?;
            let name = file.strip_prefix(root).unwrap_or(&file);
            findings.extend(source_findings(name, &text));
        }
    }
    Ok(findings)
}

fn manifest_findings(package: &str, manifest: &str, allowed: &[&str]) -> Vec<String> {
    let names = manifest.lines().filter_map(|line| line.split(['=', '.', ' ']).next());
    names
        .filter(|name| name.starts_with("plumbtone-") && !allowed.contains(name))
        .map(|name| format!("{package}/Cargo.toml: {package} must not depend on {name}"))
        .collect()
}

fn source_findings(name: &Path, text: &str) -> Vec<String> {
    let mut findings = Vec::new();
    let shown = name.display();
    if !text.starts_with("//! ") {
        findings.push(format!("{shown}: does not begin with a line that says what it is for"));
    }
    let lines = text.lines().count();
    if lines > LINES_MAX {
        findings.push(format!("{shown}: {lines} lines, more than {LINES_MAX}"));
    }
    let stem = name.file_stem().and_then(|stem| stem.to_str()).unwrap_or_default();
    if NAMES_OF_NOTHING.contains(&stem) {
        findings.push(format!("{shown}: a file is named after what is in it"));
    }
    for (index, line) in text.lines().enumerate() {
        let absolute = ABSOLUTE.iter().any(|start| line.contains(&format!("\"/{start}/")));
        if absolute {
            findings.push(format!("{shown}:{}: an absolute path", index + 1));
        }
    }
    findings
}

fn sources(folder: &Path) -> Result<Vec<PathBuf>> {
    let mut found = Vec::new();
    let mut entries: Vec<PathBuf> =
        fs::read_dir(folder)?.map(|entry| entry.map(|e| e.path())).collect::<Result<_, _>>()?;
    entries.sort();
    for path in entries {
        if path.is_dir() && path.file_name().is_some_and(|name| name != "target") {
            found.extend(sources(&path)?);
        } else if path.extension().is_some_and(|extension| extension == "rs") {
            found.push(path);
        }
    }
    Ok(found)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_tidy_file_has_no_finding() {
        let findings =
            source_findings(Path::new("analysis/src/lag.rs"), "//! Lags.\n\nfn lag() {}\n");
        assert_eq!(findings, Vec::<String>::new(), "a header and few lines");
    }

    #[test]
    fn every_rule_is_noticed() {
        let long = format!("//! Long.\n{}", "\n".repeat(LINES_MAX));
        for (name, text) in [
            ("analysis/src/lag.rs", "fn lag() {}\n"),
            ("analysis/src/lag.rs", &long),
            ("analysis/src/utils.rs", "//! Lags.\n"),
            (
                "analysis/src/lag.rs",
                &format!("//! Lags.\nconst A: &str = \"/{}/a\";\n", ABSOLUTE[4]),
            ),
        ] {
            let findings = source_findings(Path::new(name), text);
            assert_eq!(findings.len(), 1, "{name}, {} lines: {findings:?}", text.lines().count());
        }
    }

    #[test]
    fn a_dependency_the_wrong_way_is_noticed() {
        let manifest = "[dependencies]\nplumbtone-cli.workspace = true\n";
        let findings = manifest_findings("analysis", manifest, &[]);
        assert_eq!(findings.len(), 1, "analysis must depend on nothing of ours: {findings:?}");
    }
}
