//! Every route with every role: who may is let in, who may not is not, exactly as the table says.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use house::permissions::{Decision, allowed};
use house::roles::Role;
use serde_json::json;
use tests::cellar::{PEOPLE, SITE};
use tests::{Answer, Cellar, Client, on_both_engines, random_id};

const AUDITOR: (&str, &str) = ("edi", "a ledger reads itself aloud");

/// The routes as the interface describes itself.
fn routes(cellar: &Cellar) -> Vec<(String, String)> {
    let document = cellar.nobody().get("/v1/openapi.json").expect(200).json();
    let mut routes = vec![("GET".to_owned(), "/v1/openapi.json".to_owned())];
    for (path, item) in document["paths"].as_object().unwrap() {
        for method in item.as_object().unwrap().keys() {
            if ["get", "post", "put", "patch", "delete"].contains(&method.as_str()) {
                routes.push((method.to_uppercase(), path.clone()));
            }
        }
    }
    routes
}

/// Asks with ids that name nothing and a body that says nothing: enough to be let in, not to do anything.
fn ask(client: &Client, site: &str, method: &str, path: &str) -> Answer {
    let filled = path
        .replace("{site}", site)
        .replace("{role}", "cellar")
        .replace("/v1/rule-sets/{id}", "/v1/rule-sets/us-wine")
        .replace("{id}", &random_id());
    let asking = client.request(method, &filled).key(&random_id()).header("if-match", "\"1\"");
    if method == "GET" || method == "DELETE" {
        asking.send()
    } else {
        asking.json(&json!({})).send()
    }
}

on_both_engines! {
    fn every_route_lets_in_exactly_whom_the_permission_table_names(engine) {
        let cellar = Cellar::simulated(engine);
        let body = json!({"login": AUDITOR.0, "name": "Edi Example", "password": AUDITOR.1, "roles": ["auditor"]});
        cellar.dov.post("/v1/people", &body).expect(201);
        let auditor = cellar.nobody().signed_in(SITE, AUDITOR.0, AUDITOR.1);
        let nobody = cellar.nobody();
        let garbage = cellar.nobody().with_token(Some("not.a.token".to_owned()));
        let before = cellar.size();
        let mut clients: Vec<(Role, &Client)> = vec![(Role::Auditor, &auditor)];
        for (login, _, _, role) in PEOPLE {
            clients.push((Role::parse(role).unwrap(), cellar.person(login)));
        }
        assert_eq!(clients.len(), Role::ALL.len());

        let routes = routes(&cellar);
        assert!(routes.len() > 50, "{} routes", routes.len());
        for (method, path) in &routes {
            let decision = allowed(method, path, None);
            assert_ne!(decision, Decision::NoRow, "{method} {path}");
            for stranger in [&nobody, &garbage] {
                let answer = ask(stranger, &cellar.site, method, path);
                assert_eq!(answer.status == 401, decision == Decision::SignIn, "{answer:?}");
            }
            for (role, client) in &clients {
                let answer = ask(client, &cellar.site, method, path);
                if allowed(method, path, Some(&[*role])) == Decision::Allowed {
                    assert!(![401, 403].contains(&answer.status), "{role:?}: {answer:?}");
                    assert!(answer.status < 500, "{role:?}: {answer:?}");
                } else {
                    assert_eq!(answer.status, 403, "{role:?}: {answer:?}");
                    answer.expect_problem(403, "forbidden");
                }
            }
        }
        assert_eq!(cellar.deep_check(), before);
    }

    fn a_head_request_is_judged_as_its_get(engine) {
        let cellar = Cellar::simulated(engine);
        assert_eq!(cellar.ana.request("HEAD", "/v1/batches").send().status, 200);
        assert_eq!(cellar.ana.request("HEAD", "/v1/people").send().status, 403);
        assert_eq!(cellar.nobody().request("HEAD", "/v1/batches").send().status, 401);
    }
}
