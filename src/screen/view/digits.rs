//! Digits three rows high, for the one number that must be read from across the room.

/// Three by five dots for each of `0`–`9`, `+` and `−`, row by row.
const DOTS: [(char, [u8; 5]); 12] = [
    ('0', [0b111, 0b101, 0b101, 0b101, 0b111]),
    ('1', [0b010, 0b110, 0b010, 0b010, 0b111]),
    ('2', [0b111, 0b001, 0b111, 0b100, 0b111]),
    ('3', [0b111, 0b001, 0b111, 0b001, 0b111]),
    ('4', [0b101, 0b101, 0b111, 0b001, 0b001]),
    ('5', [0b111, 0b100, 0b111, 0b001, 0b111]),
    ('6', [0b111, 0b100, 0b111, 0b101, 0b111]),
    ('7', [0b111, 0b001, 0b001, 0b001, 0b001]),
    ('8', [0b111, 0b101, 0b111, 0b101, 0b111]),
    ('9', [0b111, 0b101, 0b111, 0b001, 0b111]),
    ('+', [0b000, 0b010, 0b111, 0b010, 0b000]),
    ('−', [0b000, 0b000, 0b111, 0b000, 0b000]),
];

/// The number in three rows, each digit three cells wide with one between; other characters stand small in the middle.
pub fn rows(number: &str) -> [String; 3] {
    let mut rows = [const { String::new() }; 3];
    for char in number.chars() {
        let dots = DOTS.iter().find(|(known, _)| *known == char).map(|(_, dots)| dots);
        for (index, row) in rows.iter_mut().enumerate() {
            match dots {
                Some(dots) => {
                    let (upper, lower) = (dots[2 * index], dots.get(2 * index + 1).copied().unwrap_or(0));
                    for bit in [0b100, 0b010, 0b001] {
                        row.push(match (upper & bit != 0, lower & bit != 0) {
                            (true, true) => '█',
                            (true, false) => '▀',
                            (false, true) => '▄',
                            (false, false) => ' ',
                        });
                    }
                }
                None => row.extend([' ', if index == 1 { char } else { ' ' }, ' ']),
            }
            row.push(' ');
        }
    }
    rows
}

#[cfg(test)]
mod tests {
    #[test]
    fn digits_are_drawn_with_half_blocks() {
        assert_eq!(super::rows("+10"), [" ▄  ▄█  █▀█ ", "▀█▀  █  █ █ ", "    ▀▀▀ ▀▀▀ "]);
        assert_eq!(super::rows("–"), ["    ", " –  ", "    "]);
    }
}
