//! Hydrants that fall short of their needed flow on the maximum day, as an independent solve of the same network found
//! them (its own join rules, Hazen-Williams with the constant and exponents of `docs/method.md`, a sparse Newton solver).
//! The few mains without a diameter or C-factor had the assumed ones there too. A hydrant is `map fault` when it gives its flow once that one fault is mended.

/// The hydrant's id, what is to blame, and which.
pub const SHORT: &[(u32, &str, &str)] = &[
    (
        5023,
        "map fault",
        "near miss of main 1140: its other way is over small mains",
    ),
    (5052, "map fault", "closed valve 8209 on main 1052"),
    (5056, "map fault", "closed valve 8210 on main 1142"),
    (5080, "map fault", "near miss of main 1249"),
    (5007, "small main", "main 1304, 4 in"),
    (5012, "small main", "main 1324, 4 in"),
    (5015, "small main", "main 1396, 3 in"),
    (5035, "small main", "main 1050, 3 in"),
    (5053, "small main", "main 1415, 3 in"),
    (5057, "small main", "main 1128, 3 in"),
    (5067, "small main", "main 1129, 3 in"),
    (5072, "small main", "main 1017, 4 in"),
    (5082, "small main", "main 1208, 3 in"),
    (5085, "small main", "the mains that lead to main 1481"),
    (5004, "small main", "main 1523 is a dead end; a tenth short"),
    (5068, "small main", "main 1126; less than a tenth short"),
    (
        5018,
        "pressure elsewhere",
        "it gives its flow, but takes others below the limit",
    ),
    (
        5020,
        "pressure elsewhere",
        "it gives its flow, but takes others below the limit",
    ),
    (
        5036,
        "pressure elsewhere",
        "it gives its flow, but takes others below the limit",
    ),
    (
        5064,
        "pressure elsewhere",
        "it gives its flow, but takes others below the limit",
    ),
];
