//! The rig on pseudo-terminals: one for each port, served by a thread until it is stopped.
//!
//! A port without anybody at its other end loses what is sent, as a serial line does; what the last reader left unread is
//! thrown away. Unplugging closes the pseudo-terminal, plugging in makes a new one, often under another name; a folder
//! given to [`Rig::serve`] holds links by the ports' own names that always lead to the present one.

use std::fs::File;
use std::io::{self, Read as _, Write as _};
use std::os::fd::OwnedFd;
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};
use std::thread::JoinHandle;

use rustix::fs::{Mode, OFlags};
use rustix::pty::OpenptFlags;
use rustix::termios::{OptionalActions, QueueSelector};

use super::RigError;
use super::assembled::Rig;
use super::command::Command;
use super::log::Delivery;
use super::time::Time;
use super::transport::{SharedRig, lock};
use crate::entry::{Id, Instrument};

/// How often the ports are looked at, seconds: well within the time that a device takes to answer.
const EVERY_S: f64 = 0.002;

/// A rig being served; stops when dropped.
pub struct Served {
    rig: SharedRig,
    stop: Arc<AtomicBool>,
    trouble: Arc<Mutex<Option<RigError>>>,
    thread: Option<JoinHandle<()>>,
}

impl std::fmt::Debug for Served {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Served").field("rig", &self.rig).finish_non_exhaustive()
    }
}

impl Rig {
    /// Serves every port on a pseudo-terminal until stopped, by `time`. `folder`, which must be there, gets a link for
    /// each port, named as the port.
    ///
    /// # Errors
    /// [`RigError::Terminal`], [`RigError::Link`], [`RigError::Stopped`] when no thread can be had.
    pub fn serve(mut self, time: Arc<dyn Time>, folder: Option<&Path>) -> Result<Served, RigError> {
        self.advance(time.now_s());
        let mut terminals = Vec::new();
        for port in 0..self.ports() {
            terminals.push(Slot::new(&mut self, port, folder)?);
        }
        let rig: SharedRig = Arc::new(Mutex::new(self));
        let (stop, trouble) = (Arc::new(AtomicBool::new(false)), Arc::new(Mutex::new(None)));
        let thread = std::thread::Builder::new().name("rig".to_owned());
        let (its_rig, its_stop, its_trouble) = (Arc::clone(&rig), Arc::clone(&stop), Arc::clone(&trouble));
        let work = move || {
            while !its_stop.load(Ordering::Relaxed) {
                for slot in &mut terminals {
                    if let Err(error) = slot.attend(&its_rig, &*time) {
                        *its_trouble.lock().unwrap_or_else(PoisonError::into_inner) = Some(error);
                    }
                }
                time.sleep(EVERY_S);
            }
        };
        let thread = thread.spawn(work).map_err(|_| RigError::Stopped)?;
        Ok(Served { rig, stop, trouble, thread: Some(thread) })
    }
}

impl Served {
    /// Every instrument with the port it is found at; none for one that is unplugged.
    #[must_use]
    pub fn ports(&self) -> Vec<(Id, Option<String>)> {
        let rig = self.rig();
        let found = |id: &Id| rig.port_of(id).ok().and_then(|port| rig.found_at.get(port).cloned().flatten());
        rig.gauges.iter().map(|at_work| (at_work.gauge.id.clone(), found(&at_work.gauge.id))).collect()
    }

    /// Every instrument as an entry of the register, with the port it is found at.
    #[must_use]
    pub fn profiles(&self) -> Vec<Instrument> {
        self.rig().profiles()
    }

    /// The rig itself: what is true, the log. It stands still while this is held.
    pub fn rig(&self) -> MutexGuard<'_, Rig> {
        lock(&self.rig)
    }

    /// Does what is commanded.
    ///
    /// # Errors
    /// Those of [`Rig::command`].
    pub fn command(&self, command: Command) -> Result<(), RigError> {
        self.rig().command(command)
    }

    /// The last trouble of the thread that serves, such as a pseudo-terminal that could not be made anew; handed over once.
    #[must_use]
    pub fn take_trouble(&self) -> Option<RigError> {
        self.trouble.lock().unwrap_or_else(PoisonError::into_inner).take()
    }

    /// Stops: every port ends. Goes out: the rig, with its log.
    ///
    /// # Errors
    /// [`RigError::Stopped`] when the thread had ended in a panic.
    pub fn stop(mut self) -> Result<SharedRig, RigError> {
        self.end()?;
        Ok(Arc::clone(&self.rig))
    }

    fn end(&mut self) -> Result<(), RigError> {
        self.stop.store(true, Ordering::Relaxed);
        match self.thread.take() {
            Some(thread) => thread.join().map_err(|_| RigError::Stopped),
            None => Ok(()),
        }
    }
}

impl Drop for Served {
    fn drop(&mut self) {
        // A panic of the thread was reported where it happened.
        let _ = self.end();
    }
}

/// A port and the pseudo-terminal it is plugged into, if it is.
struct Slot {
    port: usize,
    name: String,
    link: Option<PathBuf>,
    terminal: Option<Terminal>,
}

impl Slot {
    fn new(rig: &mut Rig, port: usize, folder: Option<&Path>) -> Result<Self, RigError> {
        let name = rig.port_name(port).unwrap_or_default().to_owned();
        let link = folder.map(|folder| folder.join(&name));
        let mut slot = Self { port, name, link, terminal: None };
        slot.plug(rig)?;
        Ok(slot)
    }

    /// Makes or closes the pseudo-terminal as the rig has the plug.
    fn plug(&mut self, rig: &mut Rig) -> Result<(), RigError> {
        match (rig.plug(self.port).0, &self.terminal) {
            (true, None) => {
                let failed = |source| RigError::Terminal { port: self.name.clone(), source };
                let terminal = Terminal::new().map_err(failed)?;
                let found_at = match &self.link {
                    Some(link) => {
                        let failed = |source| RigError::Link { path: link.display().to_string(), source };
                        lead(link, &terminal.name).map_err(failed)?;
                        link.display().to_string()
                    }
                    None => terminal.name.clone(),
                };
                self.found(rig, Some(found_at));
                self.terminal = Some(terminal);
            }
            (false, Some(_)) => {
                self.close();
                self.found(rig, None);
            }
            _ => {}
        }
        Ok(())
    }

    fn found(&self, rig: &mut Rig, at: Option<String>) {
        if let Some(found_at) = rig.found_at.get_mut(self.port) {
            *found_at = at;
        }
    }

    fn close(&mut self) {
        self.terminal = None;
        if let Some(link) = &self.link
            && std::fs::symlink_metadata(link).is_ok_and(|what| what.is_symlink())
        {
            // A link that stays behind leads nowhere.
            let _ = std::fs::remove_file(link);
        }
    }

    /// Carries bytes in and messages out.
    fn attend(&mut self, rig: &Mutex<Rig>, time: &dyn Time) -> Result<(), RigError> {
        let heard = self.terminal.as_mut().map(Terminal::hear).unwrap_or_default();
        let mut rig = lock(rig);
        if let Some(held) = rig.held.get_mut(self.port) {
            *held = true;
        }
        let messages = rig.exchange(self.port, time.now_s(), &heard);
        self.plug(&mut rig)?;
        for message in messages {
            let delivery = self.terminal.as_mut().map_or(Delivery::Lost, |t| t.say(&message.bytes));
            rig.sent(self.port, message, delivery);
        }
        Ok(())
    }
}

impl Drop for Slot {
    fn drop(&mut self) {
        self.close();
    }
}

/// Makes `link` lead to `to`; one that leads elsewhere is replaced, anything else is left alone.
fn lead(link: &Path, to: &str) -> io::Result<()> {
    if std::fs::symlink_metadata(link).is_ok_and(|what| what.is_symlink()) {
        std::fs::remove_file(link)?;
    }
    std::os::unix::fs::symlink(to, link)
}

/// A pseudo-terminal from the side of the instrument.
struct Terminal {
    master: File,
    /// The name of the other side.
    name: String,
    /// Whether somebody has the other side open.
    attended: bool,
}

impl Terminal {
    fn new() -> io::Result<Self> {
        let master = rustix::pty::openpt(OpenptFlags::RDWR | OpenptFlags::NOCTTY)?;
        rustix::io::fcntl_setfd(&master, rustix::io::FdFlags::CLOEXEC)?;
        rustix::pty::grantpt(&master)?;
        rustix::pty::unlockpt(&master)?;
        let name = rustix::pty::ptsname(&master, Vec::new())?;
        let name = name.into_string().map_err(|_| io::Error::from(io::ErrorKind::InvalidData))?;
        rustix::fs::fcntl_setfl(&master, OFlags::NONBLOCK)?;
        // Bytes as they are, until the reader sets its own ways. Opened and closed once, the other side counts as not
        // there, and reading says so.
        let slave = other_side(&name)?;
        let mut modes = rustix::termios::tcgetattr(&slave)?;
        modes.make_raw();
        rustix::termios::tcsetattr(&slave, OptionalActions::Now, &modes)?;
        drop(slave);
        Ok(Self { master: File::from(master), name, attended: false })
    }

    /// What has come in.
    fn hear(&mut self) -> Vec<u8> {
        let mut heard = Vec::new();
        let mut buffer = [0_u8; 512];
        loop {
            match self.master.read(&mut buffer) {
                Ok(count) if count > 0 => heard.extend(buffer.iter().take(count)),
                Err(error) if error.kind() == io::ErrorKind::WouldBlock => {
                    self.attended = true;
                    return heard;
                }
                Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
                // No bytes, or an input and output error: nobody is there.
                _ => {
                    if std::mem::take(&mut self.attended)
                        && let Ok(slave) = other_side(&self.name)
                    {
                        // What the last reader left is not for the next; a reader that is quicker does so itself.
                        let _ = rustix::termios::tcflush(&slave, QueueSelector::IOFlush);
                    }
                    return heard;
                }
            }
        }
    }

    /// Sends bytes, as many as there is room for.
    fn say(&mut self, bytes: &[u8]) -> Delivery {
        if bytes.is_empty() {
            return Delivery::Whole;
        }
        if !self.attended {
            return Delivery::Lost;
        }
        let mut sent = 0;
        while let Some(rest) = bytes.get(sent..).filter(|rest| !rest.is_empty()) {
            match self.master.write(rest) {
                Ok(count) if count > 0 => sent += count,
                Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
                // Full, because nobody reads; the rest is lost as on a serial line.
                _ => return Delivery::Part(sent),
            }
        }
        Delivery::Whole
    }
}

fn other_side(name: &str) -> io::Result<OwnedFd> {
    let flags = OFlags::RDWR | OFlags::NOCTTY | OFlags::NONBLOCK | OFlags::CLOEXEC;
    Ok(rustix::fs::open(name, flags, Mode::empty())?)
}
