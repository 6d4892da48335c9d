/* SPDX-License-Identifier: GPL-3.0-or-later */

/* How the page looks, and the little script that sorts the table of many genes. */
#include "base/file.h"
#include "report/page_parts.h"

#include <nettle/base64.h>
#include <string.h>

/* Two palettes, one layout. Text is held to a readable length; tables and pictures may be wider. */
const char tarry_page_style[] =
    ":root{--paper:#fbfbf8;--ink:#1f2b2d;--quiet:#566466;--line:#d9dfdc;--band:#f1f4f1;"
    "--link:#0d6468;--note:#fdf3dc;--note-line:#b98a2f;--bad:#9c3b1f;color-scheme:light dark}\n"
    "@media (prefers-color-scheme:dark){:root{--paper:#141a1b;--ink:#dde5e3;--quiet:#9aa9a8;"
    "--line:#303a3b;--band:#1b2324;--link:#74c6c2;--note:#2c2617;--note-line:#c79b45;"
    "--bad:#ef9a78}}\n"
    "*{box-sizing:border-box}\n"
    "html{-webkit-text-size-adjust:100%;text-size-adjust:100%}\n"
    "body{margin:0 auto;padding:1.25rem 1rem 4rem;max-width:76rem;background:var(--paper);"
    "color:var(--ink);font:1rem/1.55 system-ui,-apple-system,\"Segoe UI\",\"DejaVu Sans\","
    "sans-serif;overflow-wrap:break-word}\n"
    "h1{font-size:1.6rem;line-height:1.25;margin:.5rem 0 .75rem;max-width:44rem}\n"
    "h2{font-size:1.25rem;margin:2.75rem 0 .75rem;padding-top:.75rem;"
    "border-top:1px solid var(--line)}\n"
    "h3{font-size:1.1rem;margin:2rem 0 .5rem}\n"
    "h3 small{font-weight:400;color:var(--quiet);font-size:.9rem}\n"
    "p,li,figcaption,dd{max-width:44rem}\n"
    "p{margin:.6rem 0}\n"
    "p:empty{display:none}\n"
    "a{color:var(--link)}\n"
    ":focus-visible{outline:2px solid var(--link);outline-offset:2px}\n"
    ".run{color:var(--quiet)}\n"
    ".state{font-weight:600;color:var(--link)}\n"
    ".state.partial{color:var(--bad)}\n"
    ".told b{font-weight:600}\n"
    ".i,.unit,.again{color:var(--quiet)}\n"
    ".told .i{font-size:.9em;white-space:nowrap}\n"
    ".warnings{background:var(--note);border-left:4px solid var(--note-line);"
    "padding:.1rem 1rem .4rem;margin:1.25rem 0;max-width:48rem}\n"
    ".warnings h2{border:0;margin:.6rem 0 .2rem;padding:0;font-size:1.05rem}\n"
    ".warnings ul{margin:.3rem 0;padding-left:1.1rem}\n"
    ".warnings li{margin:.35rem 0}\n"
    "nav ul{list-style:none;margin:.5rem 0;padding:0;columns:14rem;max-width:64rem}\n"
    "nav li{break-inside:avoid;padding:.15rem 0}\n"
    "nav ul ul{columns:auto;margin:0;padding-left:1rem}\n"
    "table{border-collapse:collapse;margin:1rem 0;font-size:.92rem;line-height:1.35;"
    "font-variant-numeric:tabular-nums}\n"
    "caption{text-align:left;font-size:.85rem;color:var(--quiet);padding:0 0 .35rem}\n"
    "th,td{padding:.22rem .45rem;text-align:left;vertical-align:baseline;font-weight:400}\n"
    "th:first-child{padding-left:0}\n"
    "thead th{border-bottom:1px solid var(--ink);font-size:.85rem;vertical-align:bottom}\n"
    "tbody tr{border-bottom:1px solid var(--line)}\n"
    ".part th{padding-top:.9rem;font-weight:600}\n"
    "th.n,td.n{text-align:right;white-space:nowrap}\n"
    "td.i,th.i{white-space:nowrap;padding-right:.9rem}\n"
    ".unit{font-size:.85em;white-space:nowrap}\n"
    ".scroll{overflow-x:auto;margin:1rem 0}\n"
    ".scroll table{margin:0}\n"
    ".scroll tbody th,.scroll thead th:first-child{position:sticky;left:0;"
    "background:var(--paper)}\n"
    ".tall{max-height:75vh;overflow-y:auto}\n"
    ".tall thead th{position:sticky;top:0;background:var(--paper);z-index:1}\n"
    ".tall thead th:first-child{z-index:2}\n"
    "th button{font:inherit;color:inherit;background:none;border:0;padding:0;cursor:pointer;"
    "text-decoration:underline dotted;text-align:inherit}\n"
    "th[aria-sort=ascending] button::after{content:\" \\2191\"}\n"
    "th[aria-sort=descending] button::after{content:\" \\2193\"}\n"
    ".beside{display:flex;flex-wrap:wrap;gap:.5rem 3rem;align-items:flex-start}\n"
    ".telling{flex:1 1 24rem;min-width:0}\n"
    ".numbers{flex:0 1 auto;min-width:0;max-width:100%}\n"
    "summary{cursor:pointer;color:var(--link);padding:.3rem 0}\n"
    ".pictures{display:grid;gap:2rem 2.5rem;"
    "grid-template-columns:repeat(auto-fill,minmax(min(100%,30rem),1fr))}\n"
    "figure{margin:0;min-width:0}\n"
    ".picture svg{display:block;width:100%;height:auto;max-width:44rem}\n"
    "@media screen and (prefers-color-scheme:dark){.picture svg{filter:brightness(1.3)}}\n"
    "figcaption{font-size:.9rem;line-height:1.45;margin-top:.4rem}\n"
    "pre{background:var(--band);padding:.8rem 1rem;overflow-x:auto;font-size:.85rem;"
    "line-height:1.45}\n"
    "code{font-family:ui-monospace,\"DejaVu Sans Mono\",monospace;font-size:.92em}\n"
    ".command code{white-space:pre-wrap;overflow-wrap:anywhere}\n"
    ".digest{overflow-wrap:anywhere}\n"
    "dt{font-weight:600;margin-top:.6rem}\n"
    "dd{margin:0 0 .2rem}\n"
    "footer{margin-top:3rem;padding-top:.75rem;border-top:1px solid var(--line);"
    "color:var(--quiet);font-size:.9rem}\n"
    "@media (max-width:30rem){body{padding:.75rem .75rem 3rem}h1{font-size:1.35rem}"
    "table{font-size:.84rem}th,td{padding:.2rem .3rem}td.i,th.i{padding-right:.5rem}}\n"
    "@media print{:root{--paper:#fff;--ink:#000;--quiet:#444;--line:#bbb;--band:#f4f4f4;"
    "--link:#000;--note:#fff;--note-line:#666;--bad:#000}"
    "body{max-width:none;padding:0;font-size:10pt}nav,details{display:none}"
    ".scroll{overflow:visible}.tall{max-height:none}.scroll th{position:static!important}"
    "h2,h3{break-after:avoid}figure,tr,.warnings{break-inside:avoid}"
    ".pictures{display:block;columns:2;column-gap:.6cm}figure{margin-bottom:.6cm}"
    ".picture svg{max-height:20cm}"
    "figcaption{font-size:8.5pt}table{font-size:8.5pt}h2{margin-top:1.2cm}"
    "pre{white-space:pre-wrap;overflow-wrap:anywhere}a{text-decoration:none}}\n";

/* Heads of the table of all genes become buttons that sort it: numbers from the most to the least
 * first, names the other way. Nothing in it needs escaping in XML. */
const char tarry_page_script[] =
    "\"use strict\";\n"
    "document.querySelectorAll(\"#all-genes thead th\").forEach(function (head, column) {\n"
    "  const body = head.closest(\"table\").tBodies[0];\n"
    "  const button = document.createElement(\"button\");\n"
    "  const key = function (row) {\n"
    "    const text = row.cells[column].textContent;\n"
    "    return head.classList.contains(\"n\") ? parseFloat(text) : text;\n"
    "  };\n"
    "  button.type = \"button\";\n"
    "  button.append(...head.childNodes);\n"
    "  head.append(button);\n"
    "  button.addEventListener(\"click\", function () {\n"
    "    const first = head.classList.contains(\"n\") ? \"descending\" : \"ascending\";\n"
    "    const other = first === \"descending\" ? \"ascending\" : \"descending\";\n"
    "    const order = head.getAttribute(\"aria-sort\") === first ? other : first;\n"
    "    const sign = order === \"ascending\" ? 1 : -1;\n"
    "    const compare = function (a, b) {\n"
    "      const x = key(a), y = key(b);\n"
    "      if (typeof x === \"string\") return sign * x.localeCompare(y, \"en\", {numeric: "
    "true});\n"
    "      if (Number.isNaN(x) || Number.isNaN(y)) return Number.isNaN(x) - Number.isNaN(y);\n"
    "      return sign * (x - y);\n"
    "    };\n"
    "    body.append(...Array.from(body.rows).sort(compare));\n"
    "    head.parentNode.querySelectorAll(\"th\").forEach(function (h) {\n"
    "      h.removeAttribute(\"aria-sort\");\n"
    "    });\n"
    "    head.setAttribute(\"aria-sort\", order);\n"
    "  });\n"
    "});\n";

enum { HASH_SIZE = BASE64_ENCODE_RAW_LENGTH(32) };

/* SHA-256 of the script in base64, as the policy wants it. */
static void hash_script(char out[HASH_SIZE + 1]) {
    static const char digits[] = "0123456789abcdef";
    char hex[TARRY_SHA256_TEXT];
    uint8_t bytes[32];
    tarry_sha256(tarry_page_script, strlen(tarry_page_script), hex);
    for (size_t i = 0; i < sizeof bytes; i++)
        bytes[i] = (uint8_t)((strchr(digits, hex[2 * i]) - digits) * 16 +
                             (strchr(digits, hex[2 * i + 1]) - digits));
    base64_encode_raw(out, sizeof bytes, bytes);
    out[HASH_SIZE] = '\0';
}

/* The browser fetches nothing whatever stands in the page, and runs that script at most. */
void tarry_page_policy(bool with_script, tarry_text *text) {
    char hash[HASH_SIZE + 1];
    hash_script(hash);
    tarry_text_add_string(text, "default-src 'none'; style-src 'unsafe-inline'");
    if (with_script)
        tarry_text_printf(text, "; script-src 'sha256-%s'", hash);
}
