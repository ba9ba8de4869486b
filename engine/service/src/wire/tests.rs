use prost::Message as _;
use ropewalk_api::ropewalk::v1;

use super::*;

fn run_request() -> v1::RunRequest {
    let node = |id: &str| v1::Node {
        id: id.to_owned(),
        xyz_m: vec![1.0, 2.0, 3.0],
        ..v1::Node::default()
    };
    let cable = |id: &str| v1::Cable {
        id: id.to_owned(),
        nodes: vec!["A".to_owned(), "m".to_owned()],
        ..v1::Cable::default()
    };
    v1::RunRequest {
        brief: Some(v1::Brief {
            id: "b".to_owned(),
            labels: [("office".to_owned(), "north".to_owned())].into(),
            net_source: Some(v1::brief::NetSource::Net(v1::Net {
                nodes: vec![node("A"), node("m")],
                cables: vec![cable("ridge"), cable("")],
                ..v1::Net::default()
            })),
            cases: vec![v1::Case {
                id: "storm".to_owned(),
                factors: [("snow".to_owned(), 1.5)].into(),
                ..v1::Case::default()
            }],
            ..v1::Brief::default()
        }),
        only: vec!["storm".to_owned()],
    }
}

fn read_run(bytes: &[u8]) -> Result<Unknown, Malformed> {
    let schema = Schema::of_the_contract();
    let request = schema
        .request("/ropewalk.v1.BriefService/Run")
        .expect("of the contract");
    read(&schema, request, bytes)
}

/// Field 999 with value 1, as a varint.
const FIELD_999: [u8; 3] = [0xb8, 0x3e, 0x01];

/// A field that holds bytes; its number is below 16.
fn field(number: u8, inside: &[u8]) -> Vec<u8> {
    let mut bytes = vec![number << 3 | 2];
    prost::encoding::encode_varint(inside.len() as u64, &mut bytes);
    bytes.extend_from_slice(inside);
    bytes
}

#[test]
fn a_good_request_has_no_unknown_fields() {
    assert_eq!(read_run(&run_request().encode_to_vec()), Ok(Unknown::default()));
}

#[test]
fn unknown_fields_are_named_by_their_place() {
    // Brief is field 1 of the request; in it, net is 5, labels 4, cases 11.
    let cable = |mut bytes: Vec<u8>| {
        bytes.extend(FIELD_999);
        let cables = schema_number("cables");
        field(1, &field(5, &[field(cables, &[]), field(cables, &bytes)].concat()))
    };
    let case = field(1, &field(11, &[field(1, b"storm"), FIELD_999.to_vec()].concat()));
    for (bytes, path) in [
        (FIELD_999.to_vec(), "999"),
        (field(1, &FIELD_999), "999"),
        (cable(field(1, b"ridge")), "net.cables[ridge].999"),
        (cable(Vec::new()), "net.cables[1].999"),
        (case, "cases[storm].999"),
        (
            field(1, &field(4, &[field(1, b"office"), FIELD_999.to_vec()].concat())),
            "labels[office].999",
        ),
    ] {
        let unknown = read_run(&bytes).expect("protobuf");
        assert_eq!((unknown.paths, unknown.total), (vec![path.to_owned()], 1));
    }
}

fn schema_number(name: &str) -> u8 {
    let pool = prost_reflect::DescriptorPool::decode(ropewalk_api::FILE_DESCRIPTOR_SET).expect("descriptors");
    let net = pool.get_message_by_name("ropewalk.v1.Net").expect("a net");
    u8::try_from(net.get_field_by_name(name).expect("a field").number()).expect("small")
}

#[test]
fn what_is_not_protobuf_is_told() {
    for (bytes, words) in [
        (&[0x0a, 0x05, 0x01][..], "a length beyond the end"),
        (&[0x0f], "a wire type that does not exist"),
        (&[0x0c], "the end of a group that did not begin"),
        (&[0x80, 0x80], "a number that does not end"),
        (&[0xff; 11], "a number of more than 64 bits"),
        (&[0x00, 0x00], "a field number 0"),
        (&[0x08, 0x01], "a value of another type than the contract has"),
        (&[0x12, 0x01, 0xff], "text that is not UTF-8 at \"only\""),
    ] {
        let told = read_run(bytes).expect_err(words).to_string();
        assert!(told.contains(words), "{told}");
    }
    // Deep nesting of unknown groups ends, and does not overflow the stack.
    assert_eq!(
        read_run(&[0x1b; 100_000]).expect_err("too deep").to_string(),
        "groups nested too deeply"
    );
}

#[test]
fn what_would_fill_the_memory_is_refused_where_it_begins_to() {
    // In a brief: net is 5; in it, sections are 2. In a cable, nodes are 4.
    let sections = |n: usize| field(1, &field(5, &[0x12, 0x00].repeat(n)));
    assert_eq!(read_run(&sections(5000)), Ok(Unknown::default()));
    let told = read_run(&sections(1_000_000)).expect_err("too many").to_string();
    let words = "far more elements than its size allows for at \"net.sections[";
    assert!(told.starts_with(words), "{told}");
    let path = field(4, b"").repeat(1_000_000);
    let cable = field(1, &field(5, &field(schema_number("cables"), &path)));
    assert_eq!(read_run(&cable), Ok(Unknown::default()));

    // The densest briefs that people write: nothing but cases, with ids and factors as short as can be.
    let mut request = run_request();
    let case = |number: usize| v1::Case {
        id: number.to_string(),
        factors: [("s".to_owned(), 1.0)].into(),
        ..v1::Case::default()
    };
    request.brief.as_mut().expect("a brief").cases = (0..100_000).map(case).collect();
    assert_eq!(read_run(&request.encode_to_vec()), Ok(Unknown::default()));
}

/// Whatever passes here can be decoded, so that the generated decoder behind never has the last word.
#[test]
fn whatever_passes_is_decoded() {
    let good = run_request().encode_to_vec();
    let mut random = 0x9e37_79b9_7f4a_7c15_u64;
    let mut next = move |below: usize| {
        // xorshift64: Marsaglia 2003, "Xorshift RNGs".
        random ^= random << 13;
        random ^= random >> 7;
        random ^= random << 17;
        usize::try_from(random % below as u64).expect("small")
    };
    let schema = Schema::of_the_contract();
    let request = schema
        .request("/ropewalk.v1.BriefService/Run")
        .expect("of the contract");
    let (mut passed, mut refused) = (0, 0);
    for _ in 0..20_000 {
        let mut bytes = good.clone();
        for _ in 0..=next(3) {
            let at = next(bytes.len());
            match next(3) {
                0 => bytes[at] = u8::try_from(next(256)).expect("a byte"),
                1 => bytes.truncate(at.max(1)),
                _ => {
                    bytes.remove(at);
                    bytes.push(0);
                }
            }
        }
        let decoded = v1::RunRequest::decode(&bytes[..]).is_ok();
        match read(&schema, request, &bytes) {
            Ok(_) => {
                assert!(decoded, "passed, but cannot be decoded: {bytes:02x?}");
                passed += 1;
            }
            Err(_) => refused += 1,
        }
    }
    assert!(passed > 500 && refused > 500, "{passed} passed, {refused} refused");
}
