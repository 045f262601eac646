//! The modulator's duty limits against what the circuit bears.

use crate::control::ControlLaw;
use crate::converter::Stage;
use crate::finding::{Finding, Remedy};
use crate::quantity::{Unit, print_digits};

/// A modulator that gives more than the duty ratio the circuit bears.
pub(super) fn core_saturates(stage: &Stage, law: &ControlLaw) -> Option<Finding> {
    let limit = stage.duty_limit.filter(|limit| law.duty_greatest > limit.greatest)?;
    let most = print_digits(limit.greatest, Unit::One, 3);
    let message = format!(
        "The modulator gives duty ratios up to {}, and the circuit bears {most}: {}.",
        print_digits(law.duty_greatest, Unit::One, 3),
        limit.why
    );
    // A little below: rounding must not leave it above.
    let safe = (limit.greatest * 1000.0).floor() / 1000.0;
    Some(
        Finding::notice("control.duty.greatest", message)
            .with_hint("a load step or a start can drive it there")
            .with_remedy(Remedy {
                label: format!("Set the greatest duty ratio to {safe}"),
                values: vec![("control.duty.greatest".to_owned(), safe)],
                choices: Vec::new(),
            }),
    )
}
