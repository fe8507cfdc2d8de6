//! Opening the window: which renderer, and what to say when there is no display.

use super::Window;
use crate::render::{CpuApp, CpuWindow};
use std::cell::Cell;
use std::ffi::OsString;
use std::io::Write;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::PathBuf;
use std::process::{Command, ExitCode};
use std::rc::Rc;

/// Size of a first window, in points.
const SIZE: [f32; 2] = [1440.0, 900.0];
/// Smallest size at which nothing is cut off.
const LEAST_SIZE: [f32; 2] = [1040.0, 620.0];
/// The window's title until a project has a name.
const TITLE: &str = "Whitesmith";

/// What draws the window.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, clap::ValueEnum)]
pub enum Renderer {
    /// OpenGL, and the processor where there is none.
    #[default]
    Auto,
    /// OpenGL only.
    Glow,
    /// The processor only.
    Cpu,
}

/// Opens the window on a project or on spectra files and returns when it is closed: 0, or 2 when there is no window.
pub fn open(files: &[PathBuf], renderer: Renderer) -> ExitCode {
    if let Some(sentence) = missing_display() {
        return fail(&sentence);
    }
    match renderer {
        Renderer::Cpu => open_cpu(files),
        Renderer::Glow => match open_glow(files) {
            Ok(()) => ExitCode::SUCCESS,
            Err(Failed { sentence, .. }) => {
                fail(&format!("the OpenGL window could not be opened: {sentence}"))
            }
        },
        Renderer::Auto => match open_glow(files) {
            Ok(()) => ExitCode::SUCCESS,
            Err(Failed { after_start: true, sentence }) => fail(&sentence),
            // One process can hold one event loop only, so the second attempt is a new process.
            Err(Failed { sentence, .. }) => reopen_cpu(files, &sentence),
        },
    }
}

/// On systems whose displays are named by variables: the sentence to print when none is.
fn missing_display() -> Option<String> {
    if !cfg!(all(unix, not(target_os = "macos"))) {
        return None;
    }
    let set = |name: &str| std::env::var_os(name).is_some_and(|value| !value.is_empty());
    (!set("DISPLAY") && !set("WAYLAND_DISPLAY") && !set("WAYLAND_SOCKET")).then(|| {
        "no display to open a window on: neither DISPLAY nor WAYLAND_DISPLAY is set. The commands (whitesmith --help) need none".to_owned()
    })
}

fn fail(sentence: &str) -> ExitCode {
    // Where the error stream is closed there is nobody left to tell.
    let _ = writeln!(std::io::stderr(), "whitesmith: {sentence}");
    ExitCode::from(2)
}

struct Failed {
    sentence: String,
    after_start: bool,
}

fn open_glow(files: &[PathBuf]) -> Result<(), Failed> {
    let started = Rc::new(Cell::new(false));
    let options = eframe::NativeOptions {
        renderer: eframe::Renderer::Glow,
        viewport: egui::ViewportBuilder::default()
            .with_title(TITLE)
            .with_app_id("whitesmith")
            .with_inner_size(SIZE)
            .with_min_inner_size(LEAST_SIZE),
        persist_window: false,
        ..Default::default()
    };
    // A missing system library or GL configuration is reported by a panic inside the toolkit; its text is kept for
    // our own sentence. Once the window is up, panics are printed as usual.
    let usual = std::panic::take_hook();
    std::panic::set_hook(Box::new(|_| {}));
    let usual = Rc::new(Cell::new(Some(usual)));
    let outcome = {
        let (started, usual) = (Rc::clone(&started), Rc::clone(&usual));
        catch_unwind(AssertUnwindSafe(move || {
            eframe::run_native(
                TITLE,
                options,
                Box::new(move |creation| {
                    started.set(true);
                    if let Some(hook) = usual.take() {
                        std::panic::set_hook(hook);
                    }
                    Ok(Box::new(Window::open(&creation.egui_ctx, files)))
                }),
            )
        }))
    };
    if let Some(hook) = usual.take() {
        std::panic::set_hook(hook);
    }
    let after_start = started.get();
    match outcome {
        Ok(Ok(())) => Ok(()),
        Ok(Err(error)) => Err(Failed { sentence: error.to_string(), after_start }),
        Err(payload) => {
            let text = payload
                .downcast_ref::<String>()
                .cloned()
                .or_else(|| payload.downcast_ref::<&str>().map(|s| (*s).to_owned()))
                .unwrap_or_else(|| "the window toolkit stopped".to_owned());
            Err(Failed { sentence: text, after_start })
        }
    }
}

fn open_cpu(files: &[PathBuf]) -> ExitCode {
    match CpuWindow::run(TITLE, SIZE, |context| Window::open(context, files)) {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => fail(&error.to_string()),
    }
}

fn reopen_cpu(files: &[PathBuf], why: &str) -> ExitCode {
    let _ = writeln!(std::io::stderr(), "whitesmith: no OpenGL window ({why}); drawing with the processor");
    let mut arguments: Vec<OsString> = vec!["--renderer".into(), "cpu".into()];
    arguments.extend(files.iter().map(|file| file.clone().into_os_string()));
    let run = std::env::current_exe().and_then(|program| Command::new(program).args(arguments).status());
    match run {
        Ok(status) => ExitCode::from(status.code().and_then(|code| u8::try_from(code).ok()).unwrap_or(2)),
        Err(error) => fail(&format!("the program could not be started again: {error}")),
    }
}

impl eframe::App for Window {
    fn logic(&mut self, context: &egui::Context, _: &mut eframe::Frame) {
        self.before_frame(context);
    }

    fn ui(&mut self, ui: &mut egui::Ui, _: &mut eframe::Frame) {
        self.frame(ui);
    }

    fn clear_color(&self, visuals: &egui::Visuals) -> [f32; 4] {
        visuals.panel_fill.to_normalized_gamma_f32()
    }
}

impl CpuApp for Window {
    fn logic(&mut self, context: &egui::Context) {
        self.before_frame(context);
    }

    fn ui(&mut self, ui: &mut egui::Ui) {
        self.frame(ui);
    }
}
