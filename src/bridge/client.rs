//! The page's side: one worker at a time, replaced and fed again when it dies or hangs.

use std::cell::RefCell;
use std::rc::{Rc, Weak};
use std::sync::Arc;

use gloo::events::EventListener;
use gloo::timers::callback::Interval;
use js_sys::Array;
use wasm_bindgen::{JsCast, JsValue};
use web_sys::{File, MessageEvent, Worker};

use millpond::fault::Fault;
use millpond::sheet::{Sheet, View};

use super::{Answer, Progress, Request, host};

/// How often a working worker is asked whether it still turns, ms.
const PING_MS: u32 = 3_000;
/// Pings without any answer after which it counts as hung.
const UNHEARD: u32 = 6;
/// Deaths over the same request after which it is not tried again.
const DEATHS: u32 = 2;

/// What happens at the worker, told to the page.
pub(crate) enum Event {
    /// How far it is.
    Progress(Progress),
    /// A new sheet.
    Sheet(Arc<Sheet>),
    /// What stopped the work.
    Fault(Fault),
    /// A case file that was read, and the files of its record.
    Case { case: String, files: Vec<File> },
    /// A case file with its record.
    Packed(String),
    /// What stopped an errand; the figures are not concerned.
    Failed(Fault),
    /// The worker died or hung; another one has taken over and begins anew.
    Restarted,
}

/// The page's end of the bridge.
#[derive(Clone)]
pub(crate) struct Bridge(Rc<RefCell<Inner>>);

struct Inner {
    tell: Rc<dyn Fn(Event)>,
    worker: Option<(Worker, [EventListener; 3])>,
    watch: Option<Interval>,
    site: String,
    files: Vec<File>,
    /// The case as the text of its file.
    case: String,
    view: View,
    revision: u32,
    waiting: bool,
    /// The errand that is awaited, with the files it is about.
    errand: Option<(Request, Vec<File>)>,
    errands: u32,
    unheard: u32,
    deaths: u32,
    /// Whether the worker that is there now has the files.
    fed: bool,
    /// Whether it has said anything yet; until then its program may still be on its way.
    alive: bool,
}

impl Bridge {
    /// A bridge that tells what happens to a function of the page. The first worker is started when the first file comes:
    /// until then nobody has to wait for its program.
    pub(crate) fn new(tell: impl Fn(Event) + 'static) -> Self {
        let bridge = Self(Rc::new(RefCell::new(Inner {
            tell: Rc::new(tell),
            worker: None,
            watch: None,
            site: String::new(),
            files: Vec::new(),
            case: String::new(),
            view: View::default(),
            revision: 0,
            waiting: false,
            errand: None,
            errands: 0,
            unheard: 0,
            deaths: 0,
            fed: false,
            alive: false,
        })));
        let weak = Rc::downgrade(&bridge.0);
        let watch = Interval::new(PING_MS, move || {
            if let Some(bridge) = upgraded(&weak) {
                bridge.watch();
            }
        });
        bridge.0.borrow_mut().watch = Some(watch);
        bridge
    }

    /// Opens files: reads them and computes everything. The case is the text of its file.
    pub(crate) fn open(&self, files: Vec<File>, site: String, case: String, view: View) {
        {
            let mut inner = self.0.borrow_mut();
            (inner.files, inner.site, inner.case, inner.view) = (files, site, case, view);
            inner.deaths = 0;
            inner.ask();
        }
        if self.0.borrow().worker.is_none() {
            self.spawn();
        }
        self.feed();
    }

    /// Computes again for a changed case.
    pub(crate) fn change(&self, case: String, view: View) {
        let request = {
            let mut inner = self.0.borrow_mut();
            (inner.case, inner.view) = (case.clone(), view.clone());
            inner.deaths = 0;
            if inner.files.is_empty() {
                return;
            }
            Request::Change { revision: inner.ask(), case, view }
        };
        self.post_or_feed(&request);
    }

    /// Has the engine read the text of a case file.
    pub(crate) fn read_case(&self, name: String, text: String) {
        self.send_out(|errand| Request::ReadCase { errand, name, text }, Vec::new());
    }

    /// Has the engine pack the open files into a case.
    pub(crate) fn pack(&self, case: String) {
        let files = self.0.borrow().files.clone();
        self.send_out(|errand| Request::Pack { errand, case }, files);
    }

    /// Sends an errand; one that is still out is forgotten.
    fn send_out(&self, request: impl FnOnce(u32) -> Request, files: Vec<File>) {
        if self.0.borrow().worker.is_none() {
            self.spawn();
        }
        {
            let mut inner = self.0.borrow_mut();
            inner.errands += 1;
            inner.deaths = 0;
            inner.unheard = 0;
            inner.errand = Some((request(inner.errands), files));
        }
        self.post_errand();
    }

    fn post_errand(&self) {
        let errand = self.0.borrow().errand.clone();
        if let Some((request, files)) = errand {
            let files: Array = files.iter().collect();
            self.post_with(&request, |envelope| super::beside(envelope, "files", &files));
        }
    }

    /// Whether that errand is the one awaited; it then no longer is.
    fn back(&self, number: u32) -> bool {
        let mut inner = self.0.borrow_mut();
        let awaited = inner.errands == number && inner.errand.is_some();
        if awaited {
            inner.errand = None;
            inner.deaths = 0;
        }
        awaited
    }

    /// Shows something else of the same results.
    pub(crate) fn look(&self, view: View) {
        let request = {
            let mut inner = self.0.borrow_mut();
            inner.view = view.clone();
            if inner.files.is_empty() {
                return;
            }
            Request::Look { revision: inner.ask(), view }
        };
        self.post_or_feed(&request);
    }

    /// Leaves off whatever is being computed.
    pub(crate) fn stop(&self) {
        {
            let mut inner = self.0.borrow_mut();
            // Answers that are already on their way are stale from here on.
            inner.revision += 1;
            inner.waiting = false;
        }
        self.post(&Request::Stop);
    }

    /// Has no files open any more.
    pub(crate) fn close(&self) {
        self.0.borrow_mut().files.clear();
        self.stop();
    }

    /// Whether an answer is awaited.
    pub(crate) fn waiting(&self) -> bool {
        let inner = self.0.borrow();
        inner.waiting || inner.errand.is_some()
    }

    /// Whether files are open.
    pub(crate) fn has_files(&self) -> bool {
        !self.0.borrow().files.is_empty()
    }

    fn spawn(&self) {
        let worker = match host::spawn() {
            Ok(worker) => worker,
            Err(error) => {
                host::notice(&format!(
                    "Millpond's worker could not be started: {}\nAllow workers for this page, or open it in another browser.",
                    super::words(&error)
                ));
                return;
            }
        };
        let listen = |name: &'static str, act: fn(&Self, &web_sys::Event)| {
            let weak = Rc::downgrade(&self.0);
            EventListener::new(&worker, name, move |event| {
                if let Some(bridge) = upgraded(&weak) {
                    act(&bridge, event);
                }
            })
        };
        let listeners = [
            listen("message", |bridge, event| {
                if let Some(event) = event.dyn_ref::<MessageEvent>() {
                    bridge.hear(&event.data());
                }
            }),
            listen("error", |bridge, event| {
                // The page has taken note; the browser need not report it as the page's own failure.
                event.prevent_default();
                bridge.replace("the computation stopped");
            }),
            listen("messageerror", |bridge, _| bridge.replace("an answer could not be read")),
        ];
        let mut inner = self.0.borrow_mut();
        (inner.worker, inner.fed, inner.alive) = (Some((worker, listeners)), false, false);
    }

    /// A worker that has replaced another one knows nothing yet: it is given everything.
    fn post_or_feed(&self, request: &Request) {
        let fed = self.0.borrow().fed;
        if fed { self.post(request) } else { self.feed() }
    }

    /// Hands the worker the files and the case.
    fn feed(&self) {
        let (request, files) = {
            let mut inner = self.0.borrow_mut();
            if inner.files.is_empty() {
                return;
            }
            inner.fed = true;
            let request = Request::Open {
                revision: inner.revision,
                site: inner.site.clone(),
                case: inner.case.clone(),
                view: inner.view.clone(),
            };
            (request, inner.files.iter().collect::<Array>())
        };
        self.post_with(&request, |envelope| super::beside(envelope, "files", &files));
    }

    fn post(&self, request: &Request) {
        self.post_with(request, |_| Ok(()));
    }

    fn post_with(&self, request: &Request, add: impl Fn(&js_sys::Object) -> Result<(), JsValue>) {
        let posted = super::envelope(request).and_then(|envelope| {
            add(&envelope)?;
            match &self.0.borrow().worker {
                Some((worker, _)) => worker.post_message(&envelope),
                None => Ok(()),
            }
        });
        if let Err(error) = posted {
            super::log(&format!("a request could not be sent: {}", super::words(&error)));
        }
    }

    fn hear(&self, data: &JsValue) {
        let answer = match super::open::<Answer>(data) {
            Ok(answer) => answer,
            Err(error) => {
                super::log(&format!("an answer could not be read: {}", super::words(&error)));
                return self.replace("an answer could not be read");
            }
        };
        let (current, tell) = {
            let mut inner = self.0.borrow_mut();
            (inner.unheard, inner.alive) = (0, true);
            (inner.revision, Rc::clone(&inner.tell))
        };
        match answer {
            Answer::Progress { revision, progress } if revision == current => tell(Event::Progress(progress)),
            Answer::Sheet { revision, mut sheet } if revision == current => {
                super::put_columns(&mut sheet, &super::list(data, "columns"));
                self.answered();
                tell(Event::Sheet(Arc::new(*sheet)));
            }
            Answer::Fault { revision, fault } if revision == current => {
                self.answered();
                tell(Event::Fault(fault));
            }
            Answer::Case { errand, case, names } if self.back(errand) => {
                let all = super::list(data, "files");
                let file = |(bytes, name): (JsValue, String)| {
                    File::new_with_u8_array_sequence(&Array::of1(&bytes), &name).ok()
                };
                let files = all.iter().zip(names).filter_map(file).collect();
                tell(Event::Case { case, files });
            }
            Answer::Packed { errand, text } if self.back(errand) => tell(Event::Packed(text)),
            Answer::Failed { errand, fault } if self.back(errand) => tell(Event::Failed(fault)),
            Answer::Died { text } => self.replace(&text),
            _ => {}
        }
    }

    fn answered(&self) {
        let mut inner = self.0.borrow_mut();
        inner.waiting = false;
        inner.deaths = 0;
    }

    fn watch(&self) {
        let hung = {
            let mut inner = self.0.borrow_mut();
            if !(inner.waiting || inner.errand.is_some()) || !inner.alive {
                return;
            }
            inner.unheard += 1;
            inner.unheard > UNHEARD
        };
        if hung {
            self.replace("the computation did not answer for a while");
        } else {
            self.post(&Request::Ping);
        }
    }

    /// Ends the worker, starts another and feeds it again, unless the same request has killed it before.
    fn replace(&self, why: &str) {
        let (again, tell) = {
            let mut inner = self.0.borrow_mut();
            if let Some((worker, listeners)) = inner.worker.take() {
                worker.terminate();
                drop(listeners);
            }
            inner.unheard = 0;
            inner.deaths += 1;
            let again = inner.deaths < DEATHS;
            if !again {
                inner.waiting = false;
                inner.errand = None;
            }
            (again, Rc::clone(&inner.tell))
        };
        self.spawn();
        if again {
            let waiting = self.0.borrow().waiting;
            if waiting {
                self.feed();
            }
            self.post_errand();
            return tell(Event::Restarted);
        }
        tell(Event::Fault(Fault::new(
            format!("the computation stopped twice: {why}"),
            "the page's worker",
            "The files may be larger than the memory that this browser gives a page: try fewer files or fewer columns. \
             The case is kept; changing it starts the computation anew.",
        )));
    }
}

impl Inner {
    fn ask(&mut self) -> u32 {
        self.revision += 1;
        self.waiting = true;
        self.unheard = 0;
        self.revision
    }
}

fn upgraded(weak: &Weak<RefCell<Inner>>) -> Option<Bridge> {
    weak.upgrade().map(Bridge)
}
