//! The window drawn by our own painter: needs no graphics driver.

use super::start;
use super::start::Progress;
use super::start::StartError;
use crate::app::Screen;
use crate::app::paint;
use crate::app::paint::Canvas;
use crate::app::paint::Painter;
use crate::app::settings::Placement;
use egui::ViewportCommand;
use egui::ViewportId;
use egui_winit::ActionRequested;
use egui_winit::accesskit_winit;
use std::num::NonZeroU32;
use std::sync::Arc;
use std::sync::Mutex;
use std::sync::PoisonError;
use std::time::Duration;
use std::time::Instant;
use winit::application::ApplicationHandler;
use winit::event::WindowEvent;
use winit::event_loop::ActiveEventLoop;
use winit::event_loop::ControlFlow;
use winit::event_loop::EventLoop;
use winit::event_loop::EventLoopProxy;
use winit::event_loop::OwnedDisplayHandle;
use winit::window::Window;
use winit::window::WindowId;

/// Largest texture side. Nothing but memory limits it here; this is what most graphics drivers allow.
const MAX_TEXTURE_SIDE: usize = 16_384;

/// Time between two frames when the monitor does not tell its own.
const USUAL_FRAME_TIME: Duration = Duration::from_micros(16_667);

/// While the window is hidden, its logic runs at most this often.
const HIDDEN_FRAME_TIME: Duration = Duration::from_millis(100);

/// Opens the window and returns when it is closed.
pub(super) fn run(
    place: Placement,
    screen: impl FnOnce(&egui::Context) -> Box<dyn Screen>,
    progress: &Progress,
) -> Result<(), StartError> {
    let event_loop =
        EventLoop::with_user_event().build().map_err(|_with_places_in_source| start::no_event_loop())?;
    let mut app = App {
        proxy: event_loop.create_proxy(),
        place,
        screen: Some(screen),
        progress,
        running: None,
        failure: None,
    };
    let result = event_loop.run_app(&mut app);
    match app.failure {
        Some(failure) => Err(failure),
        None => result.map_err(|_with_places_in_source| refused("the display closed the connection")),
    }
}

fn refused(reason: &str) -> StartError {
    StartError::Refused { reason: reason.to_owned() }
}

/// What wakes the event loop, apart from the display.
#[derive(Debug)]
enum Wake {
    /// egui wants another frame.
    Repaint {
        when: Instant,
        /// How many passes egui had run when it asked.
        n_passes: u64,
    },
    /// A screen reader.
    Access(accesskit_winit::Event),
}

impl From<accesskit_winit::Event> for Wake {
    fn from(event: accesskit_winit::Event) -> Self {
        Self::Access(event)
    }
}

struct App<'p, F> {
    proxy: EventLoopProxy<Wake>,
    place: Placement,
    /// Makes the screen, once.
    screen: Option<F>,
    progress: &'p Progress,
    running: Option<Running>,
    failure: Option<StartError>,
}

impl<F: FnOnce(&egui::Context) -> Box<dyn Screen>> ApplicationHandler<Wake> for App<'_, F> {
    fn resumed(&mut self, event_loop: &ActiveEventLoop) {
        let Some(screen) = self.screen.take() else { return };
        match Running::new(event_loop, &self.proxy, self.place, screen, self.progress) {
            Ok(running) => self.running = Some(running),
            Err(failure) => {
                self.failure = Some(failure);
                event_loop.exit();
            }
        }
    }

    fn window_event(&mut self, event_loop: &ActiveEventLoop, id: WindowId, event: WindowEvent) {
        let Some(running) = self.running.as_mut().filter(|running| running.window.id() == id) else { return };
        if let Err(failure) = running.on_window_event(event_loop, &event) {
            self.failure = Some(failure);
            event_loop.exit();
        }
    }

    fn user_event(&mut self, _: &ActiveEventLoop, wake: Wake) {
        if let Some(running) = &mut self.running {
            running.on_wake(wake);
        }
    }

    fn device_event(
        &mut self,
        _: &ActiveEventLoop,
        _: winit::event::DeviceId,
        event: winit::event::DeviceEvent,
    ) {
        if let (Some(running), winit::event::DeviceEvent::MouseMotion { delta }) = (&mut self.running, event)
            && running.input.on_mouse_motion(delta)
        {
            running.repaint_at(Instant::now());
        }
    }

    fn about_to_wait(&mut self, event_loop: &ActiveEventLoop) {
        if let Some(running) = &mut self.running {
            running.before_waiting(event_loop);
        }
    }

    fn exiting(&mut self, _: &ActiveEventLoop) {
        // The window must go while the display connection lives.
        self.running = None;
    }
}

/// An open window.
struct Running {
    screen: Box<dyn Screen>,
    ctx: egui::Context,
    input: egui_winit::State,
    /// Input that came while the window was hidden, for the first frame after that.
    kept_input: egui::RawInput,
    info: egui::ViewportInfo,
    painter: Painter,
    surface: softbuffer::Surface<OwnedDisplayHandle, Arc<Window>>,
    window: Arc<Window>,
    title: String,
    /// When the next frame is due.
    next_frame: Option<Instant>,
    last_frame: Instant,
    /// softbuffer does not wait for the monitor, so this keeps the pace.
    frame_time: Duration,
}

impl Running {
    fn new(
        event_loop: &ActiveEventLoop,
        proxy: &EventLoopProxy<Wake>,
        place: Placement,
        screen: impl FnOnce(&egui::Context) -> Box<dyn Screen>,
        progress: &Progress,
    ) -> Result<Self, StartError> {
        let ctx = egui::Context::default();
        // Screen readers have to be told about the window before it is seen.
        let builder = fit_to_monitor(super::window(place), event_loop).with_visible(false);
        let window = egui_winit::create_window(&ctx, event_loop, &builder);
        let window =
            Arc::new(window.map_err(|_with_places_in_source| refused("the display gives no window"))?);
        let no_surface = |_| refused("the display gives no surface to draw on");
        let context = softbuffer::Context::new(event_loop.owned_display_handle()).map_err(no_surface)?;
        let surface = softbuffer::Surface::new(&context, Arc::clone(&window)).map_err(no_surface)?;

        let mut input = egui_winit::State::new(
            ctx.clone(),
            ViewportId::ROOT,
            event_loop,
            Some(window.scale_factor() as f32),
            event_loop.system_theme(),
            Some(MAX_TEXTURE_SIDE),
        );
        input.init_accesskit(event_loop, &window, proxy.clone());
        let mut info = egui::ViewportInfo::default();
        egui_winit::update_viewport_info(&mut info, &ctx, &window, true);
        forward_repaints(&ctx, proxy.clone());

        progress.screen_begins();
        let screen = screen(&ctx);
        window.set_visible(true);
        window.request_redraw();
        let monitor_rate = window.current_monitor().and_then(|monitor| monitor.refresh_rate_millihertz());
        Ok(Self {
            screen,
            ctx,
            input,
            kept_input: egui::RawInput::default(),
            info,
            painter: Painter::new(paint::default_threads()),
            surface,
            window,
            title: String::new(),
            next_frame: None,
            last_frame: Instant::now(),
            frame_time: monitor_rate
                .map_or(USUAL_FRAME_TIME, |rate| Duration::from_secs_f64(1e3 / f64::from(rate.max(1)))),
        })
    }

    fn on_window_event(
        &mut self,
        event_loop: &ActiveEventLoop,
        event: &WindowEvent,
    ) -> Result<(), StartError> {
        match event {
            WindowEvent::RedrawRequested => {
                self.next_frame = None;
                return self.frame(event_loop);
            }
            WindowEvent::CloseRequested => self.on_close_request(event_loop),
            WindowEvent::Destroyed => event_loop.exit(),
            WindowEvent::Occluded(is_occluded) => {
                self.info.occluded = Some(*is_occluded);
                self.repaint_at(Instant::now());
            }
            WindowEvent::Resized(_) => self.window.request_redraw(),
            _ => {}
        }
        if self.input.on_window_event(&self.window, event).repaint {
            self.repaint_at(Instant::now());
        }
        Ok(())
    }

    fn on_close_request(&mut self, event_loop: &ActiveEventLoop) {
        if self.screen.close_requested() {
            event_loop.exit();
        } else {
            // The screen has something to ask.
            self.repaint_at(Instant::now());
        }
    }

    fn on_wake(&mut self, wake: Wake) {
        match wake {
            Wake::Repaint { when, n_passes } => {
                // A frame that began after the wish has fulfilled it.
                if self.ctx.cumulative_pass_nr() <= n_passes + 1 {
                    self.repaint_at(when);
                }
            }
            Wake::Access(event) => match event.window_event {
                accesskit_winit::WindowEvent::InitialTreeRequested => {
                    self.ctx.enable_accesskit();
                    self.repaint_at(Instant::now());
                }
                accesskit_winit::WindowEvent::ActionRequested(request) => {
                    self.input.on_accesskit_action_request(request);
                    self.repaint_at(Instant::now());
                }
                accesskit_winit::WindowEvent::AccessibilityDeactivated => self.ctx.disable_accesskit(),
            },
        }
    }

    /// Asks for a frame at `when`, or earlier if one is due earlier.
    fn repaint_at(&mut self, when: Instant) {
        self.next_frame = Some(self.next_frame.map_or(when, |next| next.min(when)));
    }

    fn is_hidden(&self) -> bool {
        self.info.minimized == Some(true) || self.info.occluded == Some(true)
    }

    /// Asks the display for a redraw when a frame is due, or sleeps until then.
    fn before_waiting(&mut self, event_loop: &ActiveEventLoop) {
        let frame_time = if self.is_hidden() { HIDDEN_FRAME_TIME } else { self.frame_time };
        let next = self.next_frame.map(|next| next.max(self.last_frame + frame_time));
        event_loop.set_control_flow(match next {
            Some(next) if next > Instant::now() => ControlFlow::WaitUntil(next),
            Some(_) => {
                self.next_frame = None;
                self.window.request_redraw();
                ControlFlow::Wait
            }
            None => ControlFlow::Wait,
        });
    }

    /// Runs the screen and draws it.
    fn frame(&mut self, event_loop: &ActiveEventLoop) -> Result<(), StartError> {
        self.last_frame = Instant::now();
        self.info.native_pixels_per_point = Some(self.window.scale_factor() as f32);
        self.info.minimized = self.window.is_minimized();
        self.info.focused = Some(self.window.has_focus());
        let new_input = self.input.take_egui_input(&self.window);
        let mut input = std::mem::take(&mut self.kept_input);
        input.append(new_input);
        input.viewports = std::iter::once((ViewportId::ROOT, self.info.take())).collect();

        let commands = if self.is_hidden() {
            let screen = &mut self.screen;
            let mut output = self.ctx.run_logic(&input, |ctx| screen.logic(ctx));
            self.kept_input = input;
            self.input.handle_platform_output_with_event_loop(
                &self.window,
                event_loop,
                output.platform_output,
            );
            output.viewport_commands.remove(&ViewportId::ROOT).unwrap_or_default()
        } else {
            let screen = &mut self.screen;
            let mut output = self.ctx.run_ui(input, |ui| {
                screen.logic(ui.ctx());
                screen.ui(ui);
            });
            self.input.handle_platform_output_with_event_loop(
                &self.window,
                event_loop,
                output.platform_output,
            );
            self.painter.update_textures(&mut output.textures_delta);
            let primitives = self.ctx.tessellate(output.shapes, output.pixels_per_point);
            self.draw(output.pixels_per_point, &primitives)?;
            output.viewport_output.remove(&ViewportId::ROOT).map_or_else(Vec::new, |root| root.commands)
        };
        self.obey(event_loop, commands);
        Ok(())
    }

    fn draw(
        &mut self,
        pixels_per_point: f32,
        primitives: &[egui::ClippedPrimitive],
    ) -> Result<(), StartError> {
        let size = self.window.inner_size();
        let (Some(width), Some(height)) = (NonZeroU32::new(size.width), NonZeroU32::new(size.height)) else {
            return Ok(());
        };
        let background = paint::background(&self.ctx);
        let lost = |_| refused("the display takes no pictures");
        self.surface.resize(width, height).map_err(lost)?;
        let mut pixels = self.surface.buffer_mut().map_err(lost)?;
        // Displays that take turns between several buffers give one that is older, or none yet.
        let holds_last = pixels.age() == 1;
        let (width, height) = (size.width as usize, size.height as usize);
        let canvas = Canvas { pixels: &mut pixels, width, height, holds_last };
        self.painter.paint(canvas, pixels_per_point, primitives, background);
        self.window.pre_present_notify();
        pixels.present().map_err(lost)
    }

    /// Does what the frame asked of the window.
    fn obey(&mut self, event_loop: &ActiveEventLoop, commands: Vec<ViewportCommand>) {
        let mut actions = Vec::new();
        egui_winit::process_viewport_commands(
            &self.ctx,
            &mut self.info,
            commands,
            &self.window,
            &mut actions,
        );
        for action in actions {
            let event = match action {
                ActionRequested::Cut => Some(egui::Event::Cut),
                ActionRequested::Copy => Some(egui::Event::Copy),
                ActionRequested::Paste => self.input.clipboard_text().map(egui::Event::Paste),
                // Pictures of the window are made without it, see `paint::picture_of`.
                ActionRequested::Screenshot(_) | ActionRequested::PaintWhileHidden => None,
            };
            if let Some(event) = event {
                self.input.egui_input_mut().events.push(event);
                self.repaint_at(Instant::now());
            }
        }
        let title = self.screen.title();
        if title != self.title {
            self.window.set_title(&title);
            self.title = title;
        }
        if self.info.close_requested() {
            self.info.events.clear();
            self.on_close_request(event_loop);
        }
        if self.screen.should_close() {
            event_loop.exit();
        }
    }
}

/// Lets egui, from any thread, wake the event loop.
fn forward_repaints(ctx: &egui::Context, proxy: EventLoopProxy<Wake>) {
    let proxy = Mutex::new(proxy);
    ctx.set_request_repaint_callback(move |wish| {
        // A delay beyond the clock's range means never.
        let Some(when) = Instant::now().checked_add(wish.delay) else { return };
        let wake = Wake::Repaint { when, n_passes: wish.current_cumulative_pass_nr };
        // An error says that the window is closed already.
        drop(proxy.lock().unwrap_or_else(PoisonError::into_inner).send_event(wake));
    });
}

/// Keeps the window inside a small monitor, and its corner on one that is still there.
fn fit_to_monitor(builder: egui::ViewportBuilder, event_loop: &ActiveEventLoop) -> egui::ViewportBuilder {
    let mut builder = builder;
    builder.position = builder.position.filter(|at| {
        event_loop.available_monitors().any(|monitor| {
            let corner = monitor.position().to_logical::<f32>(monitor.scale_factor());
            let size = monitor.size().to_logical::<f32>(monitor.scale_factor());
            // The title bar must be within reach.
            let (x, y) = (at.x - corner.x, at.y - corner.y);
            (-200.0..size.width - 100.0).contains(&x) && (-10.0..size.height - 60.0).contains(&y)
        })
    });
    let monitor = event_loop.primary_monitor().or_else(|| event_loop.available_monitors().next());
    let (Some(monitor), Some(size)) = (monitor, builder.inner_size) else { return builder };
    let points = monitor.size().to_logical::<f32>(monitor.scale_factor());
    builder.with_inner_size(size.min(egui::vec2(points.width, points.height)))
}
