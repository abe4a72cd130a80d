//! A real browser to open pages in: headless Chromium, driven through ChromeDriver by the W3C WebDriver
//! protocol, which is JSON over HTTP.

use std::io::{BufRead, BufReader, Write};
use std::path::Path;
use std::process::{Child, Command, Stdio};

use base64::prelude::{Engine, BASE64_STANDARD};
use serde_json::{json, Value};

/// Where this is set, a missing browser is a fault: continuous integration sets it.
const REQUIRED: &str = "KINMARK_BROWSER_REQUIRED";

/// A browser that ends with the test.
pub struct Browser {
    driver: Child,
    session: String,
    _profile: tempfile::TempDir,
}

impl Drop for Browser {
    fn drop(&mut self) {
        let _ = ureq::delete(&self.session).call();
        let _ = self.driver.kill();
        let _ = self.driver.wait();
    }
}

impl Browser {
    /// A browser for a test; without one the test is skipped, and says so loudly.
    pub fn for_test(name: &str) -> Option<Browser> {
        match Browser::start() {
            Ok(browser) => Some(browser),
            Err(why) if std::env::var_os(REQUIRED).is_some() => panic!("no browser: {why}"),
            Err(why) => {
                // Past the harness, which shows nothing of a test that passes.
                let _ = writeln!(
                    std::io::stderr(),
                    "\n*** SKIPPED: {name} needs chromium and chromedriver ({why}).\n\
                     *** On Debian: apt-get install chromium chromium-driver. With {REQUIRED}=1 this is a failure.\n"
                );
                None
            }
        }
    }

    fn start() -> Result<Browser, String> {
        let mut driver = Command::new("chromedriver")
            .arg("--port=0")
            .stdout(Stdio::piped())
            .stderr(Stdio::null())
            .spawn()
            .map_err(|e| format!("chromedriver: {e}"))?;
        let output = driver.stdout.take().expect("its output is ours");
        let mut lines = BufReader::new(output).lines().map_while(Result::ok);
        let port = lines.by_ref().find_map(|line| {
            let (_, port) = line.split_once("successfully on port ")?;
            port.trim_end_matches('.').parse::<u16>().ok()
        });
        // What it goes on to say must be read, or it would wait.
        std::thread::spawn(move || lines.for_each(drop));
        let profile = tempfile::tempdir().expect("a temporary folder can be made");
        let mut browser = Browser {
            driver,
            session: String::new(),
            _profile: profile,
        };
        let port = port.ok_or("chromedriver names no port")?;
        let base = format!("http://127.0.0.1:{port}/session");
        let arguments = [
            "--headless",
            "--no-sandbox",
            "--disable-gpu",
            "--disable-quic",
            "--no-first-run",
            "--disable-background-networking",
            "--disable-component-update",
            "--disable-sync",
            "--disable-dev-shm-usage",
            "--hide-scrollbars",
            &format!("--user-data-dir={}", browser._profile.path().display()),
        ];
        let capabilities = json!({"capabilities": {"alwaysMatch": {
            "browserName": "chrome",
            "goog:chromeOptions": {"args": arguments},
            "goog:loggingPrefs": {"browser": "ALL"},
        }}});
        let begun = post(&base, &capabilities)?;
        let id = begun["sessionId"].as_str().ok_or("no session")?;
        browser.session = format!("{base}/{id}");
        Ok(browser)
    }

    fn command(&self, path: &str, body: &Value) -> Value {
        post(&format!("{}/{path}", self.session), body).unwrap_or_else(|e| panic!("{path}: {e}"))
    }

    /// Opens a file in a window of this size.
    pub fn open(&self, page: &Path, size: (u32, u32)) {
        self.resize(size);
        let path = page.canonicalize().expect("the page is there");
        self.command("url", &json!({"url": format!("file://{}", path.display())}));
    }

    /// Makes the page see a screen of this size.
    pub fn resize(&self, (width, height): (u32, u32)) {
        let metrics =
            json!({"width": width, "height": height, "deviceScaleFactor": 1, "mobile": false});
        self.devtools("Emulation.setDeviceMetricsOverride", metrics);
    }

    /// A command of the browser's own protocol.
    pub fn devtools(&self, command: &str, parameters: Value) -> Value {
        let body = json!({"cmd": command, "params": parameters});
        self.command("goog/cdp/execute", &body)
    }

    /// Runs a script in the page and takes what it returns.
    pub fn run(&self, script: &str) -> Value {
        self.with(script, &[])
    }

    /// The same with arguments.
    pub fn with(&self, script: &str, arguments: &[Value]) -> Value {
        self.command(
            "execute/sync",
            &json!({"script": script, "args": arguments}),
        )
    }

    /// Runs a script that answers through its last argument.
    pub fn wait(&self, script: &str) -> Value {
        self.command("execute/async", &json!({"script": script, "args": []}))
    }

    /// Types keys into what has the focus, as a person would.
    pub fn keys(&self, keys: &str) {
        let strokes: Vec<Value> = keys
            .chars()
            .flat_map(|key| ["keyDown", "keyUp"].map(|kind| json!({"type": kind, "value": key})))
            .collect();
        let body = json!({"actions": [{"type": "key", "id": "keyboard", "actions": strokes}]});
        self.command("actions", &body);
    }

    /// Clicks at a place of the window.
    pub fn click_at(&self, x: f64, y: f64) {
        let (x, y) = (x.round() as i64, y.round() as i64);
        let actions = json!([
            {"type": "pointerMove", "duration": 0, "x": x, "y": y},
            {"type": "pointerDown", "button": 0},
            {"type": "pointerUp", "button": 0},
        ]);
        let body = json!({"actions": [{"type": "pointer", "id": "mouse", "actions": actions}]});
        self.command("actions", &body);
    }

    /// What the page has complained about since the last look.
    pub fn complaints(&self) -> Vec<String> {
        let log = self.command("se/log", &json!({"type": "browser"}));
        let entries = log.as_array().cloned().unwrap_or_default();
        entries.iter().map(Value::to_string).collect()
    }

    /// A picture of the whole page, kept beside what tests build.
    pub fn picture(&self, name: &str) -> Vec<u8> {
        let how = json!({"format": "png", "captureBeyondViewport": true});
        let taken = self.devtools("Page.captureScreenshot", how);
        keep(name, &taken["data"])
    }

    /// The page on paper, kept likewise.
    pub fn print(&self, name: &str) -> Vec<u8> {
        let printed = self.devtools("Page.printToPDF", json!({"printBackground": true}));
        keep(name, &printed["data"])
    }
}

fn keep(name: &str, data: &Value) -> Vec<u8> {
    let data = data.as_str().expect("data in base 64");
    let bytes = BASE64_STANDARD.decode(data).expect("base 64");
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR"));
    std::fs::write(folder.join(name), &bytes).expect("the folder of the tests can be written");
    bytes
}

/// Sends a command and takes the value of its answer.
fn post(url: &str, body: &Value) -> Result<Value, String> {
    let agent: ureq::Agent = ureq::Agent::config_builder()
        .http_status_as_error(false)
        .build()
        .into();
    let mut answer = agent.post(url).send_json(body).map_err(|e| e.to_string())?;
    let status = answer.status();
    let read = answer.body_mut().with_config().limit(1 << 28);
    let value: Value = read.read_json().map_err(|e| e.to_string())?;
    if !status.is_success() {
        return Err(value["value"]["message"]
            .as_str()
            .unwrap_or("refused")
            .to_owned());
    }
    Ok(value["value"].clone())
}
