//! Every public numeric routine has its line in the table of bounds.

use shiftkeel::rapidity::bounds::TABLE;

/// Names of the functions that a source file defines after `indent`, by the start of their names.
fn functions<'a>(source: &'a str, indent: &'a str, starts: &'a [&'a str]) -> impl Iterator<Item = &'a str> {
    let head = format!("{indent}pub const fn ");
    source
        .lines()
        .filter_map(move |line| line.strip_prefix(head.as_str()))
        .filter_map(|rest| rest.split(['(', '<']).next())
        .filter(move |name| starts.iter().any(|start| name.starts_with(start)))
}

#[test]
fn no_public_routine_is_missing() {
    let modules = [
        ("narrow", include_str!("../src/rapidity/narrow.rs")),
        ("fixed_32", include_str!("../src/rapidity/fixed_32.rs")),
        ("float_32", include_str!("../src/rapidity/float_32.rs")),
    ];
    let mut routines: Vec<String> = modules
        .iter()
        .flat_map(|(module, source)| {
            functions(source, "", &[""]).map(move |name| format!("{module}::{name}"))
        })
        .collect();
    let constructors = [
        include_str!("../src/rapidity/from_speed.rs"),
        include_str!("../src/rapidity/from_ratio.rs"),
        include_str!("../src/rapidity/shift.rs"),
    ];
    for source in constructors {
        // The one constructor of a factor stands in the first half of its file.
        let (first, second) = source.split_once("impl Rapidity {").expect("the methods of a rapidity");
        let methods = |source| functions(source, "    ", &["from_", "to_"]);
        routines.extend(methods(first).map(|name| format!("ShiftFactor::{name}")));
        routines.extend(methods(second).map(|name| format!("Rapidity::{name}")));
        routines.extend(functions(source, "", &[""]).map(str::to_owned));
    }
    assert!(routines.len() >= 30, "the sources are not read as they should be: {routines:?}");
    for routine in &routines {
        assert!(TABLE.iter().any(|bound| bound.routine == routine), "{routine} has no bound");
    }
    for bound in TABLE {
        let routine = bound.routine.split(' ').next().expect("a name");
        assert!(routines.iter().any(|name| name == routine), "{routine} has a bound and is no routine");
    }
}

#[test]
fn no_constant_is_repeated() {
    for (place, bound) in TABLE.iter().enumerate() {
        assert!(TABLE[..place].iter().all(|earlier| earlier.routine != bound.routine), "{}", bound.routine);
        assert!(bound.worst >= 0.5 && bound.worst < 2.0 && !bound.unit.is_empty());
    }
}
