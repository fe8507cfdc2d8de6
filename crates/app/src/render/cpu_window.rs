//! The window of last resort: winit and a pixel buffer, painted by the processor; neither GL nor Vulkan.

use super::Rasteriser;
use egui::{Color32, ViewportCommand, ViewportId};
use std::num::NonZeroU32;
use std::rc::Rc;
use std::sync::Mutex;
use std::time::{Duration, Instant};
use winit::application::ApplicationHandler;
use winit::event::WindowEvent;
use winit::event_loop::{ActiveEventLoop, ControlFlow, EventLoop};
use winit::window::{Window, WindowId};

/// The longest wait taken as a real wish to repaint; egui asks for "never" with far longer ones.
const NEVER: Duration = Duration::from_secs(3600);

/// What a [`CpuWindow`] shows.
pub trait CpuApp {
    /// Work before a frame that paints nothing.
    fn logic(&mut self, context: &egui::Context);
    /// One frame.
    fn ui(&mut self, ui: &mut egui::Ui);
}

/// Why there is no window.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum CpuWindowError {
    /// No connection to a display.
    #[error("no display could be reached: {0}")]
    EventLoop(#[from] winit::error::EventLoopError),
    /// The window system refused a window.
    #[error("the display gave no window: {0}")]
    Window(#[from] winit::error::OsError),
    /// The window system refused a pixel buffer.
    #[error("the display took no pixels: {0}")]
    Pixels(#[from] softbuffer::SoftBufferError),
}

/// A window painted by the processor.
pub struct CpuWindow;

impl CpuWindow {
    /// Opens the window and returns when it is closed. One event loop a process: call once.
    ///
    /// # Errors
    /// When there is no display, or it gives no window or takes no pixels.
    pub fn run<A: CpuApp>(
        title: &str,
        size_points: [f32; 2],
        make: impl FnOnce(&egui::Context) -> A,
    ) -> Result<(), CpuWindowError> {
        let events = EventLoop::<Wake>::with_user_event().build()?;
        let context = egui::Context::default();
        let proxy = Mutex::new(events.create_proxy());
        context.set_request_repaint_callback(move |wish| {
            if let Ok(proxy) = proxy.lock() {
                // A send fails only once the loop has ended, when nothing needs painting any more.
                let _ = proxy.send_event(Wake(Instant::now() + wish.delay.min(NEVER)));
            }
        });
        let app = make(&context);
        let mut runner = Runner {
            app,
            context,
            rasteriser: Rasteriser::default(),
            open: None,
            title: title.to_owned(),
            size_points,
            next: None,
            problem: None,
        };
        events.run_app(&mut runner)?;
        runner.problem.map_or(Ok(()), Err)
    }
}

/// "Paint at this moment", sent by whoever asks egui to repaint.
#[derive(Debug)]
struct Wake(Instant);

struct Open {
    window: Rc<Window>,
    surface: softbuffer::Surface<Rc<Window>, Rc<Window>>,
    input: egui_winit::State,
    pixels: Vec<Color32>,
}

struct Runner<A> {
    app: A,
    context: egui::Context,
    rasteriser: Rasteriser,
    open: Option<Open>,
    title: String,
    size_points: [f32; 2],
    next: Option<Instant>,
    problem: Option<CpuWindowError>,
}

impl<A: CpuApp> Runner<A> {
    fn start(&self, events: &ActiveEventLoop) -> Result<Open, CpuWindowError> {
        let [width, height] = self.size_points;
        let attributes = Window::default_attributes()
            .with_title(&self.title)
            .with_inner_size(winit::dpi::LogicalSize::new(width, height));
        let window = Rc::new(events.create_window(attributes)?);
        let display = softbuffer::Context::new(Rc::clone(&window))?;
        let surface = softbuffer::Surface::new(&display, Rc::clone(&window))?;
        let scale = window.scale_factor() as f32;
        let input = egui_winit::State::new(
            self.context.clone(),
            ViewportId::ROOT,
            &*window,
            Some(scale),
            None,
            Some(4096),
        );
        Ok(Open { window, surface, input, pixels: Vec::new() })
    }

    fn paint(&mut self, events: &ActiveEventLoop) -> Result<(), CpuWindowError> {
        let Some(open) = &mut self.open else { return Ok(()) };
        let input = open.input.take_egui_input(&open.window);
        let app = &mut self.app;
        app.logic(&self.context);
        let mut output = self.context.run_ui(input, |ui| app.ui(ui));
        open.input.handle_platform_output(&open.window, std::mem::take(&mut output.platform_output));
        if let Some(root) = output.viewport_output.get(&ViewportId::ROOT) {
            for command in &root.commands {
                match command {
                    ViewportCommand::Close => events.exit(),
                    ViewportCommand::Title(title) => open.window.set_title(title),
                    _ => {}
                }
            }
            self.next = (root.repaint_delay < NEVER).then(|| Instant::now() + root.repaint_delay);
        }
        let primitives = self.context.tessellate(std::mem::take(&mut output.shapes), output.pixels_per_point);
        self.rasteriser.set_textures(&mut output.textures_delta);
        let size = open.window.inner_size();
        if let (Some(width), Some(height)) = (NonZeroU32::new(size.width), NonZeroU32::new(size.height)) {
            let (columns, rows) = (size.width as usize, size.height as usize);
            let ground = self.context.global_style().visuals.panel_fill;
            open.pixels.clear();
            open.pixels.resize(columns * rows, ground);
            self.rasteriser.paint(&primitives, output.pixels_per_point, &mut open.pixels, columns);
            open.surface.resize(width, height)?;
            let mut buffer = open.surface.buffer_mut()?;
            for (target, pixel) in buffer.iter_mut().zip(&open.pixels) {
                *target = u32::from(pixel.r()) << 16 | u32::from(pixel.g()) << 8 | u32::from(pixel.b());
            }
            buffer.present()?;
        }
        self.rasteriser.free_textures(&mut output.textures_delta);
        Ok(())
    }

    fn stop(&mut self, events: &ActiveEventLoop, problem: CpuWindowError) {
        self.problem = Some(problem);
        events.exit();
    }
}

impl<A: CpuApp> ApplicationHandler<Wake> for Runner<A> {
    fn resumed(&mut self, events: &ActiveEventLoop) {
        if self.open.is_some() {
            return;
        }
        match self.start(events) {
            Ok(open) => {
                open.window.request_redraw();
                self.open = Some(open);
            }
            Err(problem) => self.stop(events, problem),
        }
    }

    fn user_event(&mut self, _: &ActiveEventLoop, Wake(at): Wake) {
        self.next = Some(self.next.map_or(at, |sooner| sooner.min(at)));
    }

    fn window_event(&mut self, events: &ActiveEventLoop, _: WindowId, event: WindowEvent) {
        // A redraw is not news for egui: handing it over would ask for the next one, for ever.
        if let Some(open) = &mut self.open
            && !matches!(event, WindowEvent::RedrawRequested)
            && open.input.on_window_event(&open.window, &event).repaint
        {
            open.window.request_redraw();
        }
        match event {
            WindowEvent::CloseRequested => events.exit(),
            WindowEvent::RedrawRequested => {
                if let Err(problem) = self.paint(events) {
                    self.stop(events, problem);
                }
            }
            WindowEvent::Resized(_) => {
                if let Some(open) = &self.open {
                    open.window.request_redraw();
                }
            }
            _ => {}
        }
    }

    fn about_to_wait(&mut self, events: &ActiveEventLoop) {
        match self.next {
            Some(at) if at <= Instant::now() => {
                self.next = None;
                if let Some(open) = &self.open {
                    open.window.request_redraw();
                }
                events.set_control_flow(ControlFlow::Wait);
            }
            Some(at) => events.set_control_flow(ControlFlow::WaitUntil(at)),
            None => events.set_control_flow(ControlFlow::Wait),
        }
    }
}
