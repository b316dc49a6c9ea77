use crate::method::KINDS;

/// The sign of a method, the same wherever it is shown: a shape, a colour and a short code, so that no meaning hangs on colour.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Mark {
    /// A few letters and digits, unlike those of any other method published with it.
    pub code: String,
    place: usize,
}

/// On light and on dark paper, each with a contrast of at least 3 to 1 (WCAG 2.2, success criterion 1.4.11); neighbours
/// differ in lightness too, so that they are told apart without colour vision.
pub(super) const COLOURS: [(&str, &str); 8] = [
    ("#1d4f91", "#7db2f0"),
    ("#c05a12", "#f2a364"),
    ("#1a7561", "#55c9ad"),
    ("#8b2f7f", "#dd8fd2"),
    ("#857000", "#d9c54f"),
    ("#2f86b0", "#9fdcf7"),
    ("#6b3d22", "#cf9c7c"),
    ("#59636e", "#b4bfca"),
];

/// Corners of the outlines in a square from -8 to 8, y downwards: circle, square, triangles up and down, diamond, plus, cross.
const SHAPES: [&[(f64, f64)]; 7] = [
    &[
        (6.3, 0.0),
        (5.46, 3.15),
        (3.15, 5.46),
        (0.0, 6.3),
        (-3.15, 5.46),
        (-5.46, 3.15),
        (-6.3, 0.0),
        (-5.46, -3.15),
        (-3.15, -5.46),
        (0.0, -6.3),
        (3.15, -5.46),
        (5.46, -3.15),
    ],
    &[(-5.5, -5.5), (5.5, -5.5), (5.5, 5.5), (-5.5, 5.5)],
    &[(0.0, -7.0), (7.0, 5.5), (-7.0, 5.5)],
    &[(0.0, -7.5), (6.5, 0.0), (0.0, 7.5), (-6.5, 0.0)],
    &[(0.0, 7.0), (7.0, -5.5), (-7.0, -5.5)],
    &[
        (-2.0, -7.0),
        (2.0, -7.0),
        (2.0, -2.0),
        (7.0, -2.0),
        (7.0, 2.0),
        (2.0, 2.0),
        (2.0, 7.0),
        (-2.0, 7.0),
        (-2.0, 2.0),
        (-7.0, 2.0),
        (-7.0, -2.0),
        (-2.0, -2.0),
    ],
    &[
        (-7.0, -4.2),
        (-4.2, -7.0),
        (0.0, -2.8),
        (4.2, -7.0),
        (7.0, -4.2),
        (2.8, 0.0),
        (7.0, 4.2),
        (4.2, 7.0),
        (0.0, 2.8),
        (-4.2, 7.0),
        (-7.0, 4.2),
        (-2.8, 0.0),
    ],
];

impl Mark {
    /// Marks of all labels, built-in kinds in the order of the catalogue first.
    pub fn of(labels: &[String]) -> Vec<Self> {
        let kind = |label: &str| {
            let id = label.split(':').next().unwrap_or_default();
            KINDS.iter().position(|kind| kind.id == id).unwrap_or(KINDS.len())
        };
        let mut order: Vec<usize> = (0..labels.len()).collect();
        order.sort_by_key(|&k| (kind(&labels[k]), k));
        let mut marks = vec![Self { code: String::new(), place: 0 }; labels.len()];
        let mut codes: Vec<String> = Vec::new();
        for (place, k) in order.into_iter().enumerate() {
            let plain = code(&labels[k]);
            let numbered = (2..).map(|n| format!("{plain}.{n}"));
            let free = std::iter::once(plain.clone()).chain(numbered).find(|c| !codes.contains(c));
            let code = free.unwrap_or(plain);
            codes.push(code.clone());
            marks[k] = Self { code, place };
        }
        marks
    }

    /// Corners of its outline in a square from -8 to 8, y downwards.
    pub fn outline(&self) -> &'static [(f64, f64)] {
        SHAPES[self.place % SHAPES.len()]
    }

    /// Its outline, as SVG path data.
    pub fn path(&self) -> String {
        let corners: Vec<String> = self.outline().iter().map(|(x, y)| format!("{x} {y}")).collect();
        format!("M{}Z", corners.join("L"))
    }

    /// Its colour on white paper.
    pub fn on_paper(&self) -> &'static str {
        COLOURS[self.colour()].0
    }

    /// Which colour it has.
    pub fn colour(&self) -> usize {
        self.place % COLOURS.len()
    }

    /// How it is filled, as CSS.
    pub fn style(&self) -> String {
        format!("fill:var(--mark-{})", self.colour())
    }
}

/// Initials of the words of a label, and its digits: `GH3` for `gauss-hermite:order=3`.
fn code(label: &str) -> String {
    let mut code = String::new();
    let mut within = false;
    for c in label.chars() {
        match c {
            c if c.is_ascii_digit() => code.push(c),
            c if c.is_alphanumeric() && !within => code.extend(c.to_uppercase()),
            _ => {}
        }
        within = c.is_alphanumeric();
    }
    // Names of parameters say nothing that their values do not.
    let parameters = label.split(':').skip(1).filter_map(|p| p.split('=').next());
    for name in parameters {
        let initial = name.chars().next().map(|c| c.to_ascii_uppercase());
        if let Some(at) = initial.and_then(|initial| code.rfind(initial)).filter(|&at| at > 0) {
            code.remove(at);
        }
    }
    code.chars().take(7).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn codes_are_short_and_unlike_each_other() {
        let labels = ["taylor-1", "gauss-hermite:order=3", "unscented", "unscented-scaled", "ukf", "taylor 1"];
        let marks = Mark::of(&labels.map(String::from));
        let codes: Vec<&str> = marks.iter().map(|m| m.code.as_str()).collect();
        assert_eq!(codes, ["T1", "GH3", "U", "US", "U.2", "T1.2"]);
    }

    /// Relative luminance and contrast as WCAG 2.2 defines them.
    fn contrast(a: &str, b: &str) -> f64 {
        let luminance = |hex: &str| {
            let channel = |k: usize| {
                let c = f64::from(u8::from_str_radix(&hex[k..k + 2], 16).unwrap()) / 255.0;
                if c <= 0.03928 { c / 12.92 } else { ((c + 0.055) / 1.055).powf(2.4) }
            };
            0.2126 * channel(1) + 0.7152 * channel(3) + 0.0722 * channel(5)
        };
        let (a, b) = (luminance(a), luminance(b));
        (a.max(b) + 0.05) / (a.min(b) + 0.05)
    }

    /// Every colour of text and of signs on every paper that it stands on, in `page.css`.
    #[test]
    fn contrasts_are_those_of_wcag_aa() {
        let css = include_str!("../../templates/page.css");
        let themes: Vec<&str> = css.split(":root{").skip(1).take(2).collect();
        for (theme, dark) in themes.iter().zip([false, true]) {
            let value = |name: &str| {
                let rest = theme.split_once(&format!("--{name}:#")).unwrap().1;
                format!("#{}", &rest[..6])
            };
            for paper in ["paper", "panel"] {
                for ink in ["ink", "soft", "accent", "warn", "yes"] {
                    let found = contrast(&value(ink), &value(paper));
                    assert!(found >= 4.5, "{ink} on {paper}, dark {dark}: {found:.2}");
                }
                for (light, darker) in COLOURS {
                    let found = contrast(if dark { darker } else { light }, &value(paper));
                    assert!(found >= 3.0, "{light} on {paper}, dark {dark}: {found:.2}");
                }
                assert!(contrast(&value("open"), &value(paper)) >= 3.0, "dark {dark}");
            }
            for ink in ["ink", "warn"] {
                assert!(contrast(&value(ink), &value("warn-paper")) >= 4.5, "{ink}, dark {dark}");
            }
        }
        // Between the pairs that come next to each other in a list of methods.
        for pair in COLOURS.windows(2) {
            assert!(contrast(pair[0].0, pair[1].0) > 1.15, "{pair:?}");
        }
    }
}
