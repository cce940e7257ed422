//! `c`: a C99 file with a block function.

use super::head::Head;
use crate::cascade::{CLEAR_BELOW, CLEAR_PERIOD};
use crate::section::Section;

const NOTES: [&str; 4] = [
    "Use: one struct cascade_state a channel; cascade_init with the channel's first sample, then cascade_process over \
     its blocks, of any length and in order. The first sample is taken to have been there for ever, so an offset makes \
     no step. Samples must be finite. input and output may be the same array.",
    "Bits: each operation is rounded once, in the order written. Compiled so, the output of one pass is bandproof's own \
     with these sections, bit for bit, for any division into blocks: contraction to fused multiply-add must be off \
     (gcc and clang: -ffp-contract=off; -std=c99 alone is not enough everywhere), value-changing optimization too \
     (no -ffast-math), and double must be evaluated as double (FLT_EVAL_METHOD 0; on 32-bit x86 -msse2 -mfpmath=sse).",
    "Sections: one row each, in the order they run: b0 b1 b2 a0 a1 a2 of H(z) = (b0 + b1 z^-1 + b2 z^-2) / (a0 + a1 z^-1 \
     + a2 z^-2), a0 = 1, in the report's order and with its signs: y[n] = b0 x[n] + b1 x[n-1] + b2 x[n-2] - a1 y[n-1] \
     - a2 y[n-2].",
    "Needs nothing but C99's standard headers. The two functions' declarations below are all that a header needs \
     beside the struct.",
];

const CODE: &str = "
/* One channel on its way through the cascade. */
struct cascade_state {
    double s[{rows}][2]; /* s1, s2 of each section, transposed direct form II */
    unsigned frame;      /* frames so far, modulo {period} */
};

/* Starts a channel in the steady state of its first sample. */
void cascade_init(struct cascade_state *state, double first);

/* Filters the next frames of a channel. */
void cascade_process(struct cascade_state *state, const double *input, double *output, size_t frames);

/* The rounded sum; its rounding error goes to *error. */
static double two_sum(double a, double b, double *error)
{
    const double sum = a + b;
    const double b_part = sum - a;
    *error = (a - (sum - b_part)) + (b - b_part);
    return sum;
}

/* a + b + c as with twice the digits: near z = 1 the three cancel. */
static double sum_of_three(double a, double b, double c)
{
    double first, second;
    const double partial = two_sum(a, b, &first);
    const double total = two_sum(partial, c, &second);
    return total + (first + second);
}

void cascade_init(struct cascade_state *state, double first)
{
    double constant = first;
    int k;
    state->frame = 0;
    for (k = 0; k < section_count; k++) {
        const double *c = sections[k];
        const double denominator = sum_of_three(1.0, c[4], c[5]);
        double output = 0.0;
        state->s[k][0] = 0.0;
        state->s[k][1] = 0.0;
        if (denominator != 0.0) {
            output = sum_of_three(c[0], c[1], c[2]) / denominator * constant;
            state->s[k][0] = output - c[0] * constant;
            state->s[k][1] = c[2] * constant - c[5] * output;
        }
        constant = output;
    }
}

void cascade_process(struct cascade_state *state, const double *input, double *output, size_t frames)
{
    size_t n;
    int k;
    for (n = 0; n < frames; n++) {
        double sample = input[n];
        if (state->frame == 0) { /* before a state decays to where arithmetic is slow */
            for (k = 0; k < section_count; k++) {
                double *s = state->s[k];
                if (s[0] < {below} && s[0] > -{below}) s[0] = 0.0;
                if (s[1] < {below} && s[1] > -{below}) s[1] = 0.0;
            }
        }
        for (k = 0; k < section_count; k++) {
            const double *c = sections[k];
            double *s = state->s[k];
            const double x = sample;
            const double y = c[0] * x + s[0];
            s[0] = (c[1] * x + s[1]) - c[4] * y;
            s[1] = c[2] * x - c[5] * y;
            sample = y;
        }
        output[n] = sample;
        state->frame = (state->frame + 1) % {period}u;
    }
}
";

/// The file.
pub(super) fn text(head: &Head<'_>, sections: &[Section]) -> String {
    let mut text = head.comment("// ", &NOTES);
    text.push_str("\n#include <stddef.h>\n\n");
    // GCC does not know the pragma and warns.
    text.push_str("#if !defined(__GNUC__) || defined(__clang__)\n#pragma STDC FP_CONTRACT OFF\n#endif\n\n");
    text.push_str(&format!("enum {{ section_count = {} }};\n\n", sections.len()));
    let rows = if sections.is_empty() { "1" } else { "section_count" };
    text.push_str(&format!("static const double sections[{rows}][6] = {{\n"));
    for section in sections {
        let numbers: Vec<_> =
            [section.b, section.a].as_flattened().iter().map(|number| format!("{number:?}")).collect();
        text.push_str(&format!("    {{{}}},\n", numbers.join(", ")));
    }
    if sections.is_empty() {
        text.push_str("    {1.0, 0.0, 0.0, 1.0, 0.0, 0.0} /* C has no empty array; this row is not run */\n");
    }
    text.push_str("};\n");
    let code = CODE
        .replace("{rows}", rows)
        .replace("{period}", &CLEAR_PERIOD.to_string())
        .replace("{below}", &format!("{CLEAR_BELOW:?}"));
    text + &code
}
