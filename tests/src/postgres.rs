//! A throw-away PostgreSQL cluster: made in a temporary directory, destroyed when dropped.
//!
//! The server refuses to run as root, so as root everything is done as the system user `postgres`. Tests that need
//! PostgreSQL fail where it is not installed: a skipped test proves nothing.

use std::fmt::Write as _;
use std::fs;
use std::net::TcpListener;
use std::os::unix::fs::{MetadataExt, PermissionsExt};
use std::os::unix::process::CommandExt as _;
use std::path::{Path, PathBuf};
use std::process::{ChildStdin, Command, Stdio};
use std::sync::atomic::{AtomicU32, Ordering};
use std::sync::{Arc, Mutex, OnceLock, PoisonError};

use tempfile::TempDir;

/// A running server with the superuser `owner`, reachable without a password on 127.0.0.1.
#[derive(Debug)]
pub struct Cluster {
    directory: TempDir,
    programs: PathBuf,
    port: u16,
    databases: AtomicU32,
    /// Closes with this program, for whoever waits for that.
    lifeline: Option<ChildStdin>,
}

impl Cluster {
    /// Makes and starts a cluster that writes through to disk, as in production.
    ///
    /// # Panics
    /// If PostgreSQL is not installed or does not start.
    pub fn start() -> Self {
        Self::start_with(&[])
    }

    /// The same with further settings, such as `fsync = off`.
    ///
    /// # Panics
    /// As [`Cluster::start`].
    pub fn start_with(settings: &[&str]) -> Self {
        let programs = find_programs();
        let directory = tempfile::Builder::new()
            .prefix("tallystave-postgres-")
            .tempdir()
            .expect("a temporary directory");
        fs::set_permissions(directory.path(), fs::Permissions::from_mode(0o777))
            .expect("permissions of the temporary directory");
        let cluster = Self {
            directory,
            programs,
            port: free_port(),
            databases: AtomicU32::new(0),
            lifeline: None,
        };
        cluster.init();
        cluster.write_settings(settings);
        cluster.launch();
        cluster
    }

    /// The cluster that the tests of one program share; it ends with the program, even one that is killed. It does not
    /// write through to disk: use [`Cluster::start`] where a power cut is played.
    ///
    /// # Panics
    /// As [`Cluster::start`].
    pub fn shared() -> Arc<Self> {
        static SHARED: OnceLock<Arc<Cluster>> = OnceLock::new();
        Arc::clone(SHARED.get_or_init(|| {
            let mut cluster = Self::start_with(&["fsync = off"]);
            cluster.end_with_this_program();
            Arc::new(cluster)
        }))
    }

    /// Nothing drops what is static, so a shell waits until this program's end closes its standard input, and then
    /// stops the server and clears away.
    fn end_with_this_program(&mut self) {
        let stop = self.stopping();
        let mut shell = Command::new("sh");
        shell
            .args(["-c", "cat > /dev/null; \"$@\" > /dev/null 2>&1; rm -rf \"$0\""])
            .arg(self.directory.path())
            .arg(stop.get_program())
            .args(stop.get_args())
            .current_dir("/")
            .process_group(0) // an interrupt from the keyboard is for the tests, not for the shell
            .stdin(Stdio::piped())
            .stdout(Stdio::null())
            .stderr(Stdio::null());
        self.lifeline = shell.spawn().expect("a shell").stdin;
    }

    /// The port on 127.0.0.1.
    pub const fn port(&self) -> u16 {
        self.port
    }

    /// The address of a database, as its owner.
    pub fn url(&self, database: &str) -> String {
        self.url_as("owner", database)
    }

    /// The address of a database for another role.
    pub fn url_as(&self, role: &str, database: &str) -> String {
        format!("postgres://{role}@127.0.0.1:{}/{database}", self.port)
    }

    /// Makes an empty database and gives its name.
    ///
    /// # Panics
    /// If the server refuses.
    pub fn create_database(&self) -> String {
        let number = self.databases.fetch_add(1, Ordering::Relaxed);
        let name = format!("book_{number}");
        self.sql("postgres", &format!("create database {name}"));
        name
    }

    /// Runs statements as the owner.
    ///
    /// # Panics
    /// If one of them fails.
    pub fn sql(&self, database: &str, text: &str) {
        let mut psql = Command::new(self.programs.join("psql"));
        psql.args(["--no-psqlrc", "--quiet", "--set", "ON_ERROR_STOP=1", "--command", text])
            .arg(self.url(database));
        run(&mut psql);
    }

    /// Lets a role log in. Roles belong to the whole cluster, and PostgreSQL fails one of two who alter a role at once.
    ///
    /// # Panics
    /// If there is no such role.
    pub fn let_in(&self, database: &str, role: &str) {
        static ALTERING: Mutex<()> = Mutex::new(());
        let _alone = ALTERING.lock().unwrap_or_else(PoisonError::into_inner);
        self.sql(database, &format!("alter role {role} login"));
    }

    /// Stops the server without warning, as a power cut would.
    ///
    /// # Panics
    /// If it cannot be stopped.
    pub fn stop_immediately(&self) {
        self.control(&["stop", "--mode=immediate"]);
    }

    /// Starts a stopped server again.
    ///
    /// # Panics
    /// If it does not start.
    pub fn launch(&self) {
        self.control(&["start"]);
    }

    /// Makes the server a standby that can be read from but not written to; it follows nobody.
    ///
    /// # Panics
    /// If it cannot be restarted.
    pub fn stand_by(&self) {
        self.control(&["stop", "--mode=fast"]);
        let mut touch = self.as_server_program(Path::new("touch"));
        run(touch.arg(self.data().join("standby.signal")));
        self.launch();
    }

    /// Makes a standby the primary.
    ///
    /// # Panics
    /// If it is none.
    pub fn promote(&self) {
        self.control(&["promote"]);
    }

    fn data(&self) -> PathBuf {
        self.directory.path().join("data")
    }

    fn init(&self) {
        let mut initdb = self.as_server("initdb");
        initdb.arg("--pgdata").arg(self.data()).args([
            "--username=owner",
            "--auth=trust",
            "--encoding=UTF8",
            "--locale=C",
            "--no-sync",
        ]);
        run(&mut initdb);
    }

    fn write_settings(&self, settings: &[&str]) {
        let mut text = format!(
            "listen_addresses = '127.0.0.1'\nport = {}\nunix_socket_directories = '{}'\n\
             max_connections = 200\nlog_min_messages = warning\n",
            self.port,
            self.directory.path().display()
        );
        for setting in settings {
            let _ = writeln!(text, "{setting}");
        }
        let file = self.data().join("postgresql.auto.conf");
        fs::write(file, text).expect("settings of the server");
    }

    fn control(&self, arguments: &[&str]) {
        let mut control = self.as_server("pg_ctl");
        control
            .args(arguments)
            .arg("--pgdata")
            .arg(self.data())
            .arg("--log")
            .arg(self.directory.path().join("log"))
            .args(["--wait", "--timeout=60", "--silent"]);
        run(&mut control);
    }

    fn stopping(&self) -> Command {
        let mut control = self.as_server("pg_ctl");
        control.args(["stop", "--mode=immediate", "--silent", "--pgdata"]).arg(self.data());
        control
    }

    /// A server program, as a user it agrees to run as.
    fn as_server(&self, program: &str) -> Command {
        self.as_server_program(&self.programs.join(program))
    }

    fn as_server_program(&self, path: &Path) -> Command {
        let mut command = if is_root() {
            let mut command = Command::new("setpriv");
            command.args(["--reuid=postgres", "--regid=postgres", "--init-groups"]).arg(path);
            command
        } else {
            Command::new(path)
        };
        command.current_dir(self.directory.path());
        command
    }
}

impl Drop for Cluster {
    fn drop(&mut self) {
        let _ = self.stopping().stdout(Stdio::null()).stderr(Stdio::null()).status();
    }
}

fn is_root() -> bool {
    fs::metadata("/proc/self").is_ok_and(|own| own.uid() == 0)
}

/// The directory of `initdb`: the newest installed version, or what the search path offers.
fn find_programs() -> PathBuf {
    let installed = fs::read_dir("/usr/lib/postgresql").into_iter().flatten().flatten();
    let newest = installed
        .map(|version| version.path().join("bin"))
        .filter(|bin| bin.join("initdb").is_file())
        .max_by_key(|bin| version_of(bin));
    let path = std::env::var_os("PATH").unwrap_or_default();
    newest
        .or_else(|| std::env::split_paths(&path).find(|bin| bin.join("initdb").is_file()))
        .expect("PostgreSQL's server programs (initdb), which these tests need, are not installed")
}

fn version_of(bin: &Path) -> u32 {
    let version = bin.parent().and_then(Path::file_name).and_then(|name| name.to_str());
    version.and_then(|name| name.parse().ok()).unwrap_or_default()
}

fn free_port() -> u16 {
    let listener = TcpListener::bind(("127.0.0.1", 0)).expect("a free port");
    listener.local_addr().expect("the port's address").port()
}

/// Runs a program to its end; output goes to a file, since a started server would hold a pipe open.
fn run(command: &mut Command) {
    let output = tempfile::tempfile().expect("a temporary file");
    let errors = output.try_clone().expect("a second handle");
    let mut readable = output.try_clone().expect("a third handle");
    let status = command.stdin(Stdio::null()).stdout(output).stderr(errors).status();
    let succeeded = status.as_ref().is_ok_and(std::process::ExitStatus::success);
    if !succeeded {
        let mut text = String::new();
        let _ = std::io::Seek::rewind(&mut readable);
        let _ = std::io::Read::read_to_string(&mut readable, &mut text);
        panic!("{command:?} ended with {status:?}:\n{text}");
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cluster_answers_and_is_gone_afterwards() {
        let cluster = Cluster::start_with(&["fsync = off"]);
        let name = cluster.create_database();
        cluster.sql(&name, "create table t (x int); insert into t values (1)");
        let (port, directory) = (cluster.port(), cluster.directory.path().to_owned());
        drop(cluster);
        assert!(TcpListener::bind(("127.0.0.1", port)).is_ok());
        assert!(!directory.exists());
    }
}
