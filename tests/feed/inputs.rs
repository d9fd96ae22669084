//! What `--input` accepts.

use tautline::feed::{Address, Input};

#[test]
fn every_kind_is_understood() {
    let address = |host: &str, port| Address { host: host.into(), port };
    let cases = [
        ("day.jsonl", Input::File("day.jsonl".into())),
        ("/a b/día.csv.gz", Input::File("/a b/día.csv.gz".into())),
        ("C:day", Input::File("C:day".into())),
        ("-", Input::Stdin),
        ("tcp://feed.example:9000", Input::Tcp(address("feed.example", 9000))),
        ("tcp://[2001:db8::1]:9000", Input::Tcp(address("2001:db8::1", 9000))),
        ("tcp-listen://:9000", Input::TcpListen(address("127.0.0.1", 9000))),
        ("tcp-listen://0.0.0.0:9000", Input::TcpListen(address("0.0.0.0", 9000))),
        ("udp-listen://:0", Input::UdpListen(address("127.0.0.1", 0))),
        ("udp-listen://[::1]:7", Input::UdpListen(address("::1", 7))),
        ("unix:/run/feed.sock", Input::Unix("/run/feed.sock".into())),
        ("follow:day.csv", Input::Follow("day.csv".into())),
    ];
    for (text, input) in cases {
        assert_eq!(text.parse(), Ok(input), "{text}");
    }
}

#[test]
fn an_input_writes_as_it_reads() {
    for text in ["a.jsonl", "tcp://h:1", "tcp://[::1]:1", "tcp-listen://h:2", "udp-listen://h:3", "unix:u", "follow:f"]
    {
        assert_eq!(text.parse::<Input>().unwrap().to_string(), text);
    }
}

#[test]
fn what_is_not_understood_names_what_is() {
    for text in [
        "",
        "tcp://",
        "tcp://host",
        "tcp://host:",
        "tcp://host:port",
        "tcp://host:70000",
        "tcp://host:-1",
        "tcp://a b:1",
        "tcp://::1:9000",
        "tcp://[::1:9000",
        "tcp://[]:1",
        "tcp://host:9000/",
        "tcp://u@h:1",
        "tcp-listen://",
        "udp-listen://x",
        "http://host:80",
        "udp://host:9",
        "file:///day.jsonl",
        "unix:",
        "follow:",
        "\u{1b}[31m://",
    ] {
        let error = text.parse::<Input>().expect_err(text).to_string();
        for accepted in ["a path", "tcp://HOST:PORT", "tcp-listen://", "udp-listen://", "unix:PATH", "follow:PATH"] {
            assert!(error.contains(accepted), "{error}");
        }
        assert!(!error.contains(char::is_control));
    }
}
