//! The schemas as documents: valid themselves, closed, described, and free of Rust.

use serde_json::Value;

/// Both schemas by name.
fn both() -> [(&'static str, Value); 2] {
    [("spec", bandproof::spec::schema()), ("report", bandproof::report::schema())]
}

/// Calls `visit` with every object of a document and its JSON pointer.
fn walk(value: &Value, pointer: &str, visit: &mut impl FnMut(&str, &serde_json::Map<String, Value>)) {
    match value {
        Value::Object(object) => {
            visit(pointer, object);
            object.iter().for_each(|(key, child)| walk(child, &format!("{pointer}/{key}"), visit));
        }
        Value::Array(items) => {
            items.iter().enumerate().for_each(|(index, item)| walk(item, &format!("{pointer}/{index}"), visit));
        }
        _ => {}
    }
}

#[test]
fn both_are_valid_against_the_meta_schema_they_name() {
    for (name, schema) in both() {
        assert_eq!(schema["$schema"], "https://json-schema.org/draft/2020-12/schema", "{name}");
        jsonschema::draft202012::meta::validate(&schema).unwrap_or_else(|error| panic!("{name}: {error}"));
    }
    assert!(!jsonschema::draft202012::meta::is_valid(&serde_json::json!({"type": "text"})));
}

#[test]
fn both_begin_with_what_they_are() {
    for (name, schema) in both() {
        let keys: Vec<_> = schema.as_object().unwrap().keys().take(3).map(String::as_str).collect();
        assert_eq!(keys, ["$schema", "title", "description"], "{name}");
        assert!(schema["title"].as_str().unwrap().contains("bandproof"), "{name}");
    }
}

#[test]
fn every_table_is_closed_and_every_key_is_described() {
    for (name, schema) in both() {
        let (mut tables, mut keys) = (0, 0);
        walk(&schema, "", &mut |pointer, object| {
            if object.get("type").is_some_and(|of| of == "object") {
                tables += 1;
                assert_eq!(object.get("additionalProperties"), Some(&Value::Bool(false)), "{name}{pointer}");
                // A requirement has one key alone, described with it.
                if pointer.contains("/Require/") {
                    return;
                }
                assert!(object["description"].is_string(), "{name}{pointer}");
                for (key, property) in object["properties"].as_object().unwrap() {
                    keys += 1;
                    assert!(property["description"].is_string(), "{name}{pointer}: {key}");
                }
            }
        });
        assert!(tables >= 4 && keys >= 30, "{name}: {tables} tables, {keys} keys");
    }
}

#[test]
fn the_report_requires_every_key() {
    let schema = bandproof::report::schema();
    let mut tables = 0;
    walk(&schema, "", &mut |pointer, object| {
        let is_spec = ["/$defs/Auto", "/$defs/Stage", "/$defs/Band", "/$defs/Spec"].contains(&pointer);
        if object.get("type").is_some_and(|of| of == "object") && !is_spec {
            tables += 1;
            let keys: Vec<_> = object["properties"].as_object().unwrap().keys().collect();
            let required: Vec<_> =
                object["required"].as_array().unwrap().iter().map(|key| key.as_str().unwrap()).collect();
            assert_eq!(keys, required, "{pointer}");
        }
    });
    assert!(tables > 20, "{tables}");
}

#[test]
fn the_spec_requires_only_what_has_no_default() {
    let schema = bandproof::spec::schema();
    assert_eq!(schema.get("required"), None);
    assert_eq!(schema["$defs"]["Output"].get("required"), None);
    assert_eq!(schema["$defs"]["Auto"].get("required"), None);
    assert_eq!(schema["$defs"]["Stage"]["required"], serde_json::json!(["kind"]));
    assert_eq!(schema["$defs"]["Band"]["required"], serde_json::json!(["name"]));
    // The defaults it states are those the reader fills in.
    let read =
        crate::read(&serde_json::json!({"band": [{"name": "a", "center_hz": 9, "q": 3, "keep_db": 1}]})).unwrap();
    let normalized = serde_json::to_value(read).unwrap();
    assert_eq!(schema["properties"]["beyond_half_rate"]["default"], normalized["beyond_half_rate"]);
    assert_eq!(schema["properties"]["phase"]["default"], normalized["phase"]);
    assert_eq!(schema["properties"]["output"]["default"], normalized["output"]);
    for (key, value) in normalized["output"].as_object().unwrap() {
        assert_eq!(&schema["$defs"]["Output"]["properties"][key]["default"], value, "{key}");
    }
    for key in ["harmonics", "except"] {
        assert_eq!(schema["$defs"]["Band"]["properties"][key]["default"], normalized["band"][0][key], "{key}");
    }
}

#[test]
fn nothing_in_them_is_rust() {
    for (name, schema) in both() {
        walk(&schema, "", &mut |pointer, object| {
            if let Some(Value::String(text)) = object.get("description") {
                for leak in ["[`", "](", "::", "None", "Some(", "Vec<", "u32", "f64", "schemars"] {
                    assert!(!text.contains(leak), "{name}{pointer}: {leak} in {text}");
                }
            }
            if let Some(Value::String(format)) = object.get("format") {
                assert_eq!(format, "date-time", "{name}{pointer}");
            }
        });
        assert!(schema.get("$id").is_none(), "{name}: there is no address it could be fetched from");
    }
}

#[test]
fn every_number_with_a_unit_in_its_name_says_it_in_words() {
    let units: [(&str, &[&str]); 4] =
        [("_hz", &["Hz"]), ("_db", &["dB", "gain"]), ("_dbfs", &["dB", "evel"]), ("_s", &["econds"])];
    for (name, schema) in both() {
        let mut seen = 0;
        walk(&schema, "", &mut |pointer, object| {
            let Some(properties) = object.get("properties").and_then(Value::as_object) else { return };
            for (key, property) in properties {
                let unit = units.iter().find(|(suffix, _)| key.ends_with(suffix));
                let text = property.get("description").and_then(Value::as_str);
                let (Some((_, words)), Some(text)) = (unit, text) else { continue };
                seen += 1;
                // "Likewise" leans on the key before it; the type it refers to may have the unit.
                let property = property.to_string();
                let by_type = ["Hz", "Db", "Seconds"].iter().any(|of| property.contains(&format!("\"#/$defs/{of}\"")));
                assert!(by_type || words.iter().any(|word| text.contains(word)), "{name}{pointer}: {key}: {text}");
            }
        });
        assert!(seen >= 14, "{name}: {seen}");
    }
    let report = bandproof::report::schema();
    for (of, unit) in [("Hz", "Hz"), ("Db", "dB"), ("Seconds", "seconds"), ("Share", "0 to 1")] {
        let text = report["$defs"][of]["description"].as_str().unwrap();
        assert!(text.contains(unit), "{text}");
    }
}

#[test]
fn the_spec_inside_the_report_is_the_spec_with_every_default_filled_in() {
    let (spec, report) = (bandproof::spec::schema(), bandproof::report::schema());
    assert_eq!(report["$defs"]["SpecEntry"]["properties"]["normalized"]["$ref"], "#/$defs/Spec");
    for table in ["Auto", "Stage", "Band"] {
        assert_eq!(spec["$defs"][table], report["$defs"][table], "{table}");
    }
    let inside = &report["$defs"]["Spec"];
    assert_eq!(inside["properties"], spec["properties"]);
    assert_eq!(inside["required"], serde_json::json!(["beyond_half_rate", "phase", "output", "stage", "band"]));
}
