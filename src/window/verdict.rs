//! Stability in words, above the read-outs: what comes first when a loop is not simply stable.

use eframe::egui::{RichText, Ui};

use super::exact_readouts;
use super::theme::{self, palette};
use super::view::Desk;
use crate::linear::Verdict;
use crate::quantity::{self, Unit};

/// Says that the loop is unstable, undecided or conditionally stable; a stable loop needs no words.
pub(super) fn verdict_ui(ui: &mut Ui, desk: &Desk<'_>) {
    let Some(Ok(detail)) = desk.session.analysis().map(|analysis| &analysis.shown) else { return };
    let palette = palette(ui);
    let of_averaged = words(&detail.loop_gain.verdict);
    // An averaged loop that is stable may not be when it is switched: that comes first.
    let exact = desk.session.referee().and_then(|exact| exact_readouts::instability(exact.as_ref().ok()?));
    let exact = exact.filter(|_| detail.loop_gain.stable());
    let grave = !detail.loop_gain.stable() || exact.is_some();
    let Some((word, why)) = exact.or(of_averaged) else { return };
    let colour = if grave { palette.problem } else { palette.ink };
    ui.label(RichText::new(word).font(theme::figure()).color(colour));
    ui.label(RichText::new(why).font(theme::small()).color(palette.weak));
    ui.add_space(6.0);
}

/// The word, and what stands behind it.
fn words(verdict: &Verdict) -> Option<(&'static str, String)> {
    match verdict {
        Verdict::Stable { conditionally: false } => None,
        Verdict::Stable { conditionally: true } => {
            Some(("Conditionally stable", "A lower gain would make this loop unstable.".to_owned()))
        }
        Verdict::Unstable { frequency_hz, growth_per_s, poles } => {
            let grows = quantity::print_digits(1.0 / growth_per_s, Unit::Second, 3);
            let at = quantity::print_digits(*frequency_hz, Unit::Hertz, 3);
            let how = if *frequency_hz > 0.0 { format!("Oscillates at {at}") } else { "Runs away".to_owned() };
            let right = if *poles == 1 { "1 pole".to_owned() } else { format!("{poles} poles") };
            let text = format!(
                "{how}, growing with a time constant of {grows}: {right} in the right half-plane. Margins are greyed."
            );
            Some(("Unstable", text))
        }
        Verdict::Undecided { reason } => Some(("Stability undecided", reason.clone())),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_unstable_loop_is_told_with_its_frequency() {
        let verdict = Verdict::Unstable { frequency_hz: 7889.0, growth_per_s: 22800.0, poles: 2 };
        let (word, why) = words(&verdict).expect("there is something to say");
        assert_eq!(word, "Unstable");
        assert!(why.contains("7.89 kHz") && why.contains("43.9 µs") && why.contains("2 poles"), "{why}");
        assert_eq!(words(&Verdict::Stable { conditionally: false }), None);
    }
}
