//! Whether the electrodes' currents and voltages can go together, as far as it shows without a mesh.

use super::electrode::{DrawnElectrode, DrawnElectrodes};
use super::layer::Stack;
use crate::diagnostic::Span;
use crate::index::LayerId;
use crate::problem::{Contact, Drive, Join};
use crate::reading::fields::Notes;
use crate::union::Sets;

/// Given currents add up to zero within this part of the largest.
const BALANCE: f64 = 1e-9;

/// Tells of too few electrodes, of currents that do not add up, and of balance terminals that have nothing definite to balance.
pub fn check_drives(drawn: &DrawnElectrodes, contacts: &[Contact], joins: &[(Join, Span)], stack: &Stack, title: &Span, notes: &Notes) {
    let list = &drawn.list;
    if !drawn.complete {
        return;
    }
    if list.len() < 2 {
        let place = list.first().map_or(title, |e| &e.span);
        let message = if list.is_empty() { "the job has no electrode" } else { "the job has only one electrode" };
        notes.fault(
            message,
            place,
            "two or more terminals or cells",
            "add `[[terminal]]` or `[[cell]]` blocks: current needs a way in and a way out",
        );
        return;
    }
    let balances: Vec<&DrawnElectrode> = list.iter().filter(|e| e.electrode.drive == Drive::Balance).collect();
    let unknown = |e: &&DrawnElectrode| !matches!(e.electrode.drive, Drive::Current(_) | Drive::Balance);
    if balances.is_empty() && !list.iter().any(|e| unknown(&e)) {
        check_sum(list, notes);
        return;
    }
    let group = connected(contacts, joins, list, stack.layers.len());
    let home = |e: &DrawnElectrode| e.electrode.through.first().map_or(0, |l| group[l.index()]);
    for (i, balance) in balances.iter().enumerate() {
        let name = &balance.electrode.name;
        if let Some(other) = list.iter().find(|e| unknown(e) && home(e) == home(balance)) {
            let message = format!("`{name}` would take the balance, but the current of `{}` is not given", other.electrode.name);
            let labels = vec![(other.span.clone(), "its current is to be found")];
            let remedy = "give `voltage_mv` or `current_a` to the terminal";
            notes.fault_with(message, &balance.span, "a balance only where every other electrode has `current_a`", remedy, labels);
        }
        // A layer of several pieces may hold one balance on each: that shows once the pieces are known.
        let single = one_piece(stack, &group, home(balance));
        let earlier = balances.iter().take(i).find(|e| home(e) == home(balance));
        if let (Some(other), true) = (earlier, single) {
            let message = format!("`{}` and `{name}` would both take the balance", other.electrode.name);
            let labels = vec![(other.span.clone(), "the other one")];
            let remedy = "give `current_a` or `voltage_mv` to one of them";
            notes.fault_with(message, &balance.span, "at most one terminal without a drive", remedy, labels);
        }
    }
}

fn check_sum(list: &[DrawnElectrode], notes: &Notes) {
    let currents = || list.iter().filter_map(|e| if let Drive::Current(i) = e.electrode.drive { Some(i) } else { None });
    let largest = currents().fold(0.0, |most: f64, i| most.max(i.abs()));
    let sum: f64 = currents().sum();
    if sum.abs() > BALANCE * largest
        && let Some(last) = list.last()
    {
        let message = format!("the given currents add up to {sum:.9} A, not to zero");
        let remedy = "correct a current, or leave `current_a` out of one terminal: it then takes the balance";
        notes.fault(message, &last.drive_span, "currents that go in and come out in equal amount", remedy);
    }
}

/// For each layer the lowest layer it is joined with.
fn connected(contacts: &[Contact], joins: &[(Join, Span)], list: &[DrawnElectrode], layers: usize) -> Vec<usize> {
    let mut sets = Sets::new(layers);
    let mut unite = |a: LayerId, b: LayerId| sets.join(a.index(), b.index());
    contacts.iter().for_each(|c| unite(c.between[0], c.between[1]));
    joins.iter().for_each(|(j, _)| unite(j.between[0], j.between[1]));
    list.iter().for_each(|e| e.electrode.through.windows(2).for_each(|w| unite(w[0], w[1])));
    (0..layers).map(|layer| sets.root(layer)).collect()
}

/// True when every layer of the group is one piece of metal.
fn one_piece(stack: &Stack, group: &[usize], which: usize) -> bool {
    let members = || group.iter().enumerate().filter(|g| *g.1 == which).map(|g| LayerId::new(g.0));
    let pieces = |layer: LayerId| {
        let rings = stack.layers.get(layer.index()).and_then(|l| l.as_ref()).map_or(0, |l| l.rings.len());
        let metal = stack.metal(layer);
        let outer = |ring: usize| metal.is_some_and(|m| m.is_outer(ring));
        (0..rings).filter(|&r| outer(r)).take(2).count()
    };
    members().all(|layer| pieces(layer) == 1)
}
