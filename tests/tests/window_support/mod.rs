//! The window without a display: driven by test events, painted by the program's own rasteriser.

use egui::{Event, PointerButton, Pos2};
use egui_kittest::kittest::NodeT;
use egui_kittest::{Harness, TestRenderer};
use std::cell::RefCell;
use std::rc::Rc;
use whitesmith::render::Rasteriser;
use whitesmith::window::Window;

/// Hands texture changes to a rasteriser the test keeps.
struct Shared(Rc<RefCell<Rasteriser>>);

impl TestRenderer for Shared {
    fn handle_delta(&mut self, changes: &mut egui::TexturesDelta) {
        let mut rasteriser = self.0.borrow_mut();
        rasteriser.set_textures(changes);
        rasteriser.free_textures(changes);
    }
}

/// The window on the demonstration project.
pub(crate) struct Driven {
    pub(crate) harness: Harness<'static, Window>,
    rasteriser: Rc<RefCell<Rasteriser>>,
}

impl Driven {
    /// Opens it at a size in pixels.
    pub(crate) fn open(width: f32, height: f32, theme: egui::Theme) -> Self {
        let rasteriser = Rc::new(RefCell::new(Rasteriser::default()));
        let mut harness = Harness::builder()
            .with_size([width, height])
            .with_theme(theme)
            .with_max_steps(12)
            .renderer(Shared(Rc::clone(&rasteriser)))
            .build_eframe(|creation| Window::on_demonstration(&creation.egui_ctx));
        // The first frames settle the scale and the places of everything.
        harness.run_steps(4);
        Self { harness, rasteriser }
    }

    /// The usual size for tests.
    #[allow(dead_code, reason = "pictures have sizes of their own")]
    pub(crate) fn usual() -> Self {
        Self::open(1440.0, 900.0, egui::Theme::Light)
    }

    /// The frame as it stands: columns, rows and RGBA bytes.
    #[allow(dead_code, reason = "not every test file looks at pixels")]
    pub(crate) fn picture(&mut self) -> (usize, usize, Vec<u8>) {
        let (width, height, pixels) =
            self.rasteriser.borrow().picture(&self.harness.ctx, self.harness.output(), egui::Color32::BLACK);
        (width, height, pixels.iter().flat_map(egui::Color32::to_array).collect())
    }

    /// Presses the first button at a place and steps.
    #[allow(dead_code, reason = "not every test file uses the pointer")]
    pub(crate) fn press(&mut self, at: Pos2) {
        self.harness.event(Event::PointerMoved(at));
        self.harness.step();
        self.button(at, true);
    }

    /// Moves the pointer and steps once: one frame.
    #[allow(dead_code, reason = "not every test file uses the pointer")]
    pub(crate) fn move_to(&mut self, at: Pos2) {
        self.harness.event(Event::PointerMoved(at));
        self.harness.step();
    }

    /// Lets the button go and steps.
    #[allow(dead_code, reason = "not every test file uses the pointer")]
    pub(crate) fn release(&mut self, at: Pos2) {
        self.button(at, false);
    }

    fn button(&mut self, pos: Pos2, pressed: bool) {
        let button = PointerButton::Primary;
        self.harness.event(Event::PointerButton {
            pos,
            button,
            pressed,
            modifiers: egui::Modifiers::default(),
        });
        self.harness.step();
    }

    /// Shares of the current set, in row order.
    #[allow(dead_code, reason = "not every test file looks at shares")]
    pub(crate) fn shares(&self) -> Vec<f64> {
        let set = self.harness.state().state().current_set().expect("the demonstration has a set");
        set.members.iter().map(|member| member.share).collect()
    }

    /// The spoken label of the one node that begins with some words.
    #[allow(dead_code, reason = "not every test file listens")]
    pub(crate) fn spoken(&self, beginning: &str) -> String {
        self.harness
            .root()
            .children_recursive()
            .filter_map(|node| node.accesskit_node().label().or_else(|| node.accesskit_node().value()))
            .find(|label| label.starts_with(beginning))
            .unwrap_or_else(|| panic!("nothing on the screen is called {beginning}\u{2026}"))
    }
}
