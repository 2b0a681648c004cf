//! The program under test: built if need be, started, killed, started again on the same book.

use std::fs;
use std::io::{BufRead as _, BufReader};
use std::os::unix::fs::PermissionsExt as _;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, ExitStatus, Stdio};
use std::sync::{Arc, Mutex, OnceLock, PoisonError, mpsc};
use std::time::{Duration, Instant};

use tempfile::TempDir;

use crate::postgres::Cluster;

/// The role under which the program serves on PostgreSQL.
pub const SERVING_ROLE: &str = "tallystave_app";
/// The longest a start may take; an unoptimised program beside a compiler is slow.
const START: Duration = Duration::from_mins(1);
/// The longest an orderly end may take: the program gives requests under way 10 s.
const END: Duration = Duration::from_secs(30);

/// Where a book is kept.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Engine {
    /// A file.
    Sqlite,
    /// A server.
    Postgres,
}

/// A book's place: the data directory and, on PostgreSQL, the database. It is removed with its last user.
#[derive(Debug)]
pub struct Home {
    directory: TempDir,
    server: Option<(Arc<Cluster>, String)>,
}

impl Home {
    /// An empty place with its tables made.
    ///
    /// # Panics
    /// If it cannot be made.
    pub fn new(engine: Engine) -> Arc<Self> {
        match engine {
            Engine::Sqlite => Arc::new(Self { directory: directory(), server: None }),
            Engine::Postgres => Self::on(Cluster::shared()),
        }
    }

    /// An empty place on a cluster of the test's own: migrated as the owner, served as the serving role.
    ///
    /// # Panics
    /// If it cannot be made.
    pub fn on(cluster: Arc<Cluster>) -> Arc<Self> {
        // The serving role belongs to the whole cluster, so two migrations must not make it at once.
        static MIGRATING: Mutex<()> = Mutex::new(());
        let name = cluster.create_database();
        let home = Self { directory: directory(), server: Some((cluster, name)) };
        let _alone = MIGRATING.lock().unwrap_or_else(PoisonError::into_inner);
        home.run_as_owner(&["migrate"]).expect_success();
        let (cluster, name) = home.server();
        cluster.let_in(name, SERVING_ROLE);
        Arc::new(home)
    }

    /// The data directory.
    pub fn data(&self) -> PathBuf {
        self.directory.path().join("data")
    }

    /// The file of a book on SQLite.
    pub fn file(&self) -> PathBuf {
        self.data().join("book.db")
    }

    /// The cluster and the database.
    ///
    /// # Panics
    /// On SQLite.
    pub fn server(&self) -> (&Arc<Cluster>, &str) {
        let (cluster, name) = self.server.as_ref().expect("a book on PostgreSQL");
        (cluster, name)
    }

    /// Which engine it is on.
    pub const fn engine(&self) -> Engine {
        if self.server.is_some() { Engine::Postgres } else { Engine::Sqlite }
    }

    /// The address the program serves from, on PostgreSQL.
    pub fn serving_url(&self) -> Option<String> {
        self.server.as_ref().map(|(cluster, name)| cluster.url_as(SERVING_ROLE, name))
    }

    /// Runs `tallystave` on this book to its end, as it serves.
    ///
    /// # Panics
    /// If it cannot be run.
    pub fn run(&self, arguments: &[&str]) -> Outcome {
        outcome(self.command(arguments, self.serving_url().as_deref()))
    }

    /// The same as the database's owner.
    ///
    /// # Panics
    /// If it cannot be run.
    pub fn run_as_owner(&self, arguments: &[&str]) -> Outcome {
        let owner = self.server.as_ref().map(|(cluster, name)| cluster.url(name));
        outcome(self.command(arguments, owner.as_deref()))
    }

    /// Runs statements behind the program's back as whoever owns the tables: what an intruder with the database in
    /// hand could do.
    ///
    /// # Panics
    /// If they fail.
    pub fn sql(&self, text: &str) {
        if let Some((cluster, name)) = &self.server {
            return cluster.sql(name, text);
        }
        let script = "import sqlite3, sys\n\
                      book = sqlite3.connect(sys.argv[1], timeout=30)\n\
                      book.executescript(sys.argv[2])\n\
                      book.commit()\n";
        let mut python = python();
        python.args(["-c", script]).arg(self.file()).arg(text);
        outcome(python).expect_success();
    }

    /// A second directory of secrets with the same keys, as another machine of the same installation has it.
    ///
    /// # Panics
    /// If the first has not been made yet.
    pub fn copy_of_secrets(&self) -> PathBuf {
        let copy = self.directory.path().join(format!("secrets-{}", crate::random_id()));
        fs::create_dir(&copy).expect("a second directory of secrets");
        fs::set_permissions(&copy, fs::Permissions::from_mode(0o700)).expect("its permissions");
        for key in ["log.key", "token.key"] {
            fs::copy(self.data().join("secrets").join(key), copy.join(key)).expect("a key");
        }
        copy
    }

    fn command(&self, arguments: &[&str], database: Option<&str>) -> Command {
        let mut command = Command::new(binary());
        command.args(arguments).arg("--data").arg(self.data());
        if let Some(database) = database {
            command.args(["--database", database]);
        }
        only_our_settings(&mut command);
        command
    }
}

fn directory() -> TempDir {
    tempfile::Builder::new().prefix("tallystave-home-").tempdir().expect("a temporary directory")
}

/// How a program ended, and what it said.
#[derive(Debug)]
pub struct Outcome {
    /// Its exit code; `None` if a signal ended it.
    pub code: Option<i32>,
    /// What it printed.
    pub printed: String,
    /// What it complained about.
    pub complaints: String,
}

impl Outcome {
    /// The outcome, if it is a good one.
    ///
    /// # Panics
    /// If it is not.
    #[expect(
        clippy::return_self_not_must_use,
        reason = "it asserts, and most tests ask for no more"
    )]
    #[track_caller]
    pub fn expect_success(self) -> Self {
        self.expect_code(0)
    }

    /// The outcome, if the exit code is this one.
    ///
    /// # Panics
    /// If it is another.
    #[expect(
        clippy::return_self_not_must_use,
        reason = "it asserts, and most tests ask for no more"
    )]
    #[track_caller]
    pub fn expect_code(self, code: i32) -> Self {
        assert_eq!(self.code, Some(code), "printed:\n{}\n{}", self.printed, self.complaints);
        self
    }
}

/// Runs a command to its end.
///
/// # Panics
/// If it cannot be run.
pub fn outcome(mut command: Command) -> Outcome {
    let output = command.stdin(Stdio::null()).output();
    let output = output.unwrap_or_else(|error| panic!("{command:?} cannot be run: {error}"));
    Outcome {
        code: output.status.code(),
        printed: String::from_utf8_lossy(&output.stdout).into_owned(),
        complaints: String::from_utf8_lossy(&output.stderr).into_owned(),
    }
}

/// How the program is started.
#[derive(Clone, Debug, Default)]
pub struct Options {
    /// Start of the driven clock; without it the machine's clock counts.
    pub simulated_from: Option<String>,
    /// Another directory of secrets than the one in the data directory.
    pub secrets: Option<PathBuf>,
}

/// The running program. It is killed when dropped.
#[derive(Debug)]
pub struct Program {
    home: Arc<Home>,
    options: Options,
    running: Running,
}

#[derive(Debug)]
struct Running {
    child: Child,
    url: String,
    founding_token: Option<String>,
    complaints: PathBuf,
}

impl Program {
    /// Starts the program on a place; several may serve one place on PostgreSQL.
    ///
    /// # Panics
    /// If it does not start.
    pub fn start(home: &Arc<Home>, options: Options) -> Self {
        let running = launch(home, &options);
        Self { home: Arc::clone(home), options, running }
    }

    /// Where it answers.
    pub fn url(&self) -> &str {
        &self.running.url
    }

    /// The place it serves.
    pub const fn home(&self) -> &Arc<Home> {
        &self.home
    }

    /// The one-time token for founding the first book, if there was none when it started.
    pub fn founding_token(&self) -> Option<&str> {
        self.running.founding_token.as_deref()
    }

    /// What it wrote to its log so far.
    pub fn complaints(&self) -> String {
        fs::read_to_string(&self.running.complaints).unwrap_or_default()
    }

    /// Its process id.
    pub fn pid(&self) -> u32 {
        self.running.child.id()
    }

    /// Ends it without warning, as `kill -9` and the end of the world do. [`Program::restart`] starts it again.
    ///
    /// # Panics
    /// If it was not running.
    pub fn kill(&mut self) {
        self.running.child.kill().expect("a running program");
        self.running.child.wait().expect("its end");
    }

    /// Asks it to end (SIGTERM) and gives its exit status.
    ///
    /// # Panics
    /// If it does not end in time.
    pub fn terminate(&mut self) -> ExitStatus {
        let mut kill = Command::new("kill");
        kill.args(["-TERM", &self.pid().to_string()]);
        outcome(kill).expect_success();
        let deadline = Instant::now() + END;
        loop {
            if let Some(status) = self.running.child.try_wait().expect("its state") {
                return status;
            }
            assert!(Instant::now() < deadline, "it did not end: {}", self.complaints());
            std::thread::sleep(Duration::from_millis(10));
        }
    }

    /// Starts it again on the same book, after it was killed or ended. Its address changes.
    ///
    /// # Panics
    /// If it does not start.
    pub fn restart(&mut self) {
        self.running = launch(&self.home, &self.options);
    }

    /// `kill -9`, then start again.
    ///
    /// # Panics
    /// As [`Program::kill`] and [`Program::restart`].
    pub fn kill_and_restart(&mut self) {
        self.kill();
        self.restart();
    }
}

impl Drop for Running {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
        if std::thread::panicking() {
            let said = fs::read_to_string(&self.complaints).unwrap_or_default();
            eprintln!("the program's log:\n{said}");
        }
    }
}

fn launch(home: &Home, options: &Options) -> Running {
    let mut command =
        home.command(&["serve", "--listen", "127.0.0.1:0"], home.serving_url().as_deref());
    if let Some(from) = &options.simulated_from {
        command.args(["--simulated-from", from]);
    }
    if let Some(secrets) = &options.secrets {
        command.arg("--secrets").arg(secrets);
    }
    let complaints = home.directory.path().join(format!("log-{}", crate::random_id()));
    let log = fs::File::create(&complaints).expect("a file for the log");
    command.stdin(Stdio::null()).stdout(Stdio::piped()).stderr(log);
    let mut child = command.spawn().expect("the program");
    let printed = child.stdout.take().expect("its standard output");
    let mut running = Running { child, url: String::new(), founding_token: None, complaints };
    read_greeting(printed, &mut running);
    running
}

/// Reads what it prints until it says where it listens; goes on reading, so that a full pipe never stops it.
fn read_greeting(printed: std::process::ChildStdout, running: &mut Running) {
    let (say, hear) = mpsc::channel();
    std::thread::spawn(move || {
        for line in BufReader::new(printed).lines().map_while(Result::ok) {
            let _ = say.send(line);
        }
    });
    let deadline = Instant::now() + START;
    loop {
        let left = deadline.saturating_duration_since(Instant::now());
        let Ok(line) = hear.recv_timeout(left) else {
            let said = fs::read_to_string(&running.complaints).unwrap_or_default();
            panic!("the program did not start:\n{said}");
        };
        if let Some((_, token)) = line.split_once("/v1/founding#") {
            running.founding_token = Some(token.to_owned());
        }
        if let Some(url) = line.strip_prefix("listening on ") {
            url.clone_into(&mut running.url);
            return;
        }
    }
}

/// Only what a test says counts, not what the shell of whoever runs it says.
fn only_our_settings(command: &mut Command) {
    for name in ["DATA", "DATABASE", "SECRETS", "LISTEN", "PUBLIC_URL", "BEHIND_TLS", "LOG"] {
        command.env_remove(format!("TALLYSTAVE_{name}"));
    }
    command.env_remove("TALLYSTAVE_SIMULATED_FROM");
}

/// Python with the modules that independent checkers import: the one that `deploy/install test` made, else the
/// system's own.
pub fn python() -> Command {
    let made = concat!(env!("CARGO_MANIFEST_DIR"), "/../target/python/bin/python");
    let named = std::env::var_os("TALLYSTAVE_PYTHON");
    let made = || Path::new(made).exists().then(|| made.into());
    Command::new(named.or_else(made).unwrap_or_else(|| "python3".into()))
}

/// The program's path: `TALLYSTAVE_PROGRAM` if it is set, or else built by cargo for the profile these tests were built
/// for.
///
/// # Panics
/// If it cannot be built.
pub fn binary() -> &'static Path {
    static BINARY: OnceLock<PathBuf> = OnceLock::new();
    BINARY.get_or_init(|| match std::env::var_os("TALLYSTAVE_PROGRAM") {
        Some(path) => path.into(),
        None => build(),
    })
}

fn build() -> PathBuf {
    let own = std::env::current_exe().expect("the path of this test");
    // …/target/<profile>/deps/<test>; an example or a bench may stand elsewhere below the profile.
    let profile = own
        .ancestors()
        .find(|directory| directory.join("deps").is_dir())
        .expect("a directory of cargo's");
    let target = profile.parent().expect("the target directory");
    let cargo = std::env::var_os("CARGO").unwrap_or_else(|| "cargo".into());
    let mut command = Command::new(cargo);
    command
        .args(["build", "--quiet", "--package", "tallystave", "--target-dir"])
        .arg(target)
        .current_dir(concat!(env!("CARGO_MANIFEST_DIR"), "/.."));
    if profile.file_name().is_some_and(|name| name == "release") {
        command.arg("--release");
    }
    outcome(command).expect_success();
    profile.join("tallystave")
}
