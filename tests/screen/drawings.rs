use crate::{sample, stage};
#[test]
fn look() {
    let three = || vec![sample::ample(), sample::thin(), sample::spent(), sample::blind()];
    for (w, h) in [(80, 24)] {
        let mut app = stage::replay(three());
        println!("{}\n{}", "=".repeat(w as usize), stage::text(&stage::draw(&mut app, w, h, true)));
        stage::press(&mut app, "j <enter>");
        for _ in 0..if w == 80 { 6 } else { 2 } {
            println!("{}\n{}", "=".repeat(w as usize), stage::text(&stage::draw(&mut app, w, h, true)));
            stage::press(&mut app, "<tab>");
        }
    }
}
