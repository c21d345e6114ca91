//! The built page on 127.0.0.1, built again when a source is younger than it.
use crate::wasm::Finish;
use crate::{bundle, house};
use anyhow::{Result, anyhow};
use tiny_http::{Header, Method, Request, Response, Server};

/// Builds, listens, and answers until it is ended.
pub fn serve(port: u16, finish: Finish) -> Result<()> {
    bundle::say_size(&bundle::build(finish)?);
    let server = Server::http(("127.0.0.1", port))
        .map_err(|problem| anyhow!("cannot listen on 127.0.0.1:{port}: {problem}"))?;
    let address = server.server_addr();
    println!("Teasel is on  http://{address}/  (Ctrl+C ends it; a reload shows changed sources)");
    for request in server.incoming_requests() {
        if let Err(problem) = answer(request, finish) {
            println!("{problem:#}");
        }
    }
    Ok(())
}

fn answer(request: Request, finish: Finish) -> Result<()> {
    let path = request.url().split(['?', '#']).next().unwrap_or_default();
    let known = matches!(path, "/" | "/teasel.html" | "/teasel.html.sha256");
    let (code, kind, body) = if !matches!(request.method(), Method::Get | Method::Head) {
        (405, "text/plain; charset=utf-8", b"only GET\n".to_vec())
    } else if !known {
        (404, "text/plain; charset=utf-8", b"not here\n".to_vec())
    } else {
        match current(path, finish) {
            Ok(body) if path.ends_with(".sha256") => (200, "text/plain; charset=utf-8", body),
            Ok(body) => (200, "text/html; charset=utf-8", body),
            Err(problem) => {
                println!("{problem:#}");
                let text = format!("The page could not be built.\n\n{problem:#}\n");
                (500, "text/plain; charset=utf-8", text.into_bytes())
            }
        }
    };
    let mut response = Response::from_data(body).with_status_code(code);
    for (name, value) in [
        ("Content-Type", kind),
        ("Cache-Control", "no-cache"),
        ("X-Content-Type-Options", "nosniff"),
        ("Referrer-Policy", "no-referrer"),
    ] {
        if let Ok(header) = Header::from_bytes(name, value) {
            response.add_header(header);
        }
    }
    Ok(request.respond(response)?)
}

fn current(path: &str, finish: Finish) -> Result<Vec<u8>> {
    if bundle::stale() {
        println!("A source is younger than the page.");
        bundle::say_size(&bundle::build(finish)?);
    }
    let name = if path == "/" { "/teasel.html" } else { path };
    house::read(house::root().join("dist").join(&name[1..]))
}
