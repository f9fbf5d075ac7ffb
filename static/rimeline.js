// Comfort for the pages of Rimeline; every page works without it. htmx renews the
// answer while one types; this file keeps what was typed in this browser, shows
// temperatures in the other unit, says a change of the verdict once, and never lets
// an old answer pass for a new one.
(() => {
	"use strict";
	const $ = (id) => document.getElementById(id);
	const design = () => $("design");

	// ---- What was typed, kept in this browser ----

	const store = "rimeline.drafts"; // [{id, at, title, fields: {name: value}}], latest first
	const keep = 5;
	const tab = "rimeline.tab"; // in sessionStorage: the draft that this tab writes
	const goesOn = "rimeline.goes-on"; // there too: the next page is about the same design

	const drafts = () => {
		try { return JSON.parse(localStorage.getItem(store)) || []; } catch { return []; }
	};
	const save = (all) => {
		for (let n = Math.min(all.length, keep); n >= 0; n--) {
			try { return localStorage.setItem(store, JSON.stringify(all.slice(0, n))); } catch { /* no room: fewer */ }
		}
	};

	let changed = false, soon;
	const write = () => {
		const form = design();
		if (!form || !changed) return;
		changed = false;
		let id = sessionStorage.getItem(tab);
		if (!id) sessionStorage.setItem(tab, id = String(Date.now()));
		const fields = Object.fromEntries([...new FormData(form)].filter(([, value]) => typeof value === "string"));
		const title = (fields["/title"] || "").trim();
		save([{ id, at: Date.now(), title, fields }, ...drafts().filter((d) => d.id !== id)]);
	};
	const touched = () => {
		changed = true;
		clearTimeout(soon);
		soon = setTimeout(write, 300);
	};
	addEventListener("visibilitychange", () => document.visibilityState === "hidden" && write());
	addEventListener("pagehide", write);

	// The page that a form of this design leads to goes on with the same draft.
	document.addEventListener("submit", (e) => {
		if (!["design", "carried"].includes(e.target.id) || e.submitter?.formAction.endsWith("/design/file")) return;
		write();
		sessionStorage.setItem(goesOn, "yes");
	});

	const restore = (draft) => {
		sessionStorage.setItem(tab, draft.id);
		const values = { ...draft.fields, do: "show" };
		return htmx.ajax("POST", "/design", { values, target: "#workspace", select: "#workspace", swap: "outerHTML" });
	};

	const time = (at) => {
		const then = new Date(at), clock = then.toLocaleTimeString([], { hour: "2-digit", minute: "2-digit" });
		return then.toDateString() === new Date().toDateString() ? `at ${clock}` : `on ${then.toLocaleDateString()} at ${clock}`;
	};
	const named = (d) => (d.title ? `“${d.title}”` : "a design without a title");
	const button = (words, press) => {
		const b = document.createElement("button");
		b.type = "button";
		b.className = "do";
		b.textContent = words;
		b.addEventListener("click", press);
		return b;
	};
	const offer = (...rows) => {
		const box = $("offer");
		if (!box) return;
		box.replaceChildren();
		box.hidden = rows.length === 0;
		for (const row of rows) {
			const p = document.createElement("p");
			p.append(...row);
			box.append(p);
		}
	};

	// A reload brings back what this tab had; a fresh form offers what was typed before.
	const begin = () => {
		const form = design();
		if (!form) return;
		const fresh = form.hasAttribute("data-fresh");
		const again = ["reload", "back_forward"].includes(performance.getEntriesByType("navigation")[0]?.type);
		const continued = sessionStorage.getItem(goesOn) && !fresh;
		sessionStorage.removeItem(goesOn);
		const own = drafts().find((d) => d.id === sessionStorage.getItem(tab));
		if (own && again) {
			restore(own).then(() => offer([`Restored: what you typed here ${time(own.at)}. `, button("Start an empty design", () => {
				sessionStorage.removeItem(tab);
				location.assign("/design");
			})]));
			return;
		}
		if (continued) return;
		sessionStorage.removeItem(tab);
		const past = drafts().slice(0, 3);
		if (!fresh || !past.length) return;
		offer(...past.map((d) => [`You typed ${named(d)} here ${time(d.at)}. `, button("Restore it", () => restore(d).then(() => offer()))]),
			[button("Forget these", () => { localStorage.removeItem(store); offer(); })]);
	};

	// ---- Temperatures in the other unit ----

	// The same rule as on the server: exact, shown to a tenth, halves away from zero.
	const convert = (digits, scale, unit, offset) => {
		let n = digits, d = scale;
		if (unit === "°C") [n, d] = [n * 9n + offset * 5n * d, d * 5n];
		else [n, d] = [(n - offset * d) * 5n, d * 9n];
		const exact = (n * 10n) % d === 0n;
		const size = n < 0n ? -n : n;
		const tenths = (size * 20n + d) / (2n * d);
		const sign = n < 0n && tenths > 0n ? "−" : "";
		return `${exact ? "=" : "≈"} ${sign}${tenths / 10n}.${tenths % 10n} ${unit === "°C" ? "°F" : "°C"}`;
	};
	const number = /^\s*([-−–+]?)\s*(\d{1,12})(?:([.,])(\d{1,9}))?\s*(?:°?\s*([CF]))?\s*$/;
	const twin = (p) => {
		const m = $(p.dataset.of)?.value.match(number);
		const chosen = $(p.dataset.of + "-unit")?.value || "";
		const typed = m?.[5] ? "°" + m[5] : "";
		const thousands = m?.[3] === "," && m[4].length === 3 && !/^0/.test(m[2]); // or a decimal comma: it is asked
		if (!m || thousands || (typed && chosen && typed !== chosen)) return "";
		const whole = m[2] + (m[4] || "");
		const digits = BigInt(whole) * (m[1] && m[1] !== "+" ? -1n : 1n);
		const scale = 10n ** BigInt((m[4] || "").length);
		const offset = p.dataset.twin === "difference" ? 0n : 32n;
		const unit = typed || chosen;
		if (unit) return convert(digits, scale, unit, offset);
		return `in °C: ${convert(digits, scale, "°C", offset)}; in °F: ${convert(digits, scale, "°F", offset)}`;
	};
	const twins = () => document.querySelectorAll("[data-twin]").forEach((p) => { p.textContent = twin(p); });

	// ---- Names of planes in the lists that choose one ----

	const planeNames = () => {
		document.querySelectorAll('input[name^="was:/planes/"]').forEach((was) => {
			const now = was.previousElementSibling.value.trim();
			document.querySelectorAll('select[name^="/strings/"][name$="/plane"] option').forEach((o) => {
				if (now && o.value === was.value) o.textContent = now;
			});
		});
	};

	// ---- The answer ----

	const answer = () => $("answer-now");
	let late;
	const isStale = (why) => {
		clearTimeout(late);
		if (!$("stale")) return;
		$("answer").classList.add("is-stale");
		$("stale").textContent = why;
		$("stale").hidden = false;
	};
	const isFresh = () => {
		clearTimeout(late);
		if (!$("stale")) return;
		$("answer").classList.remove("is-stale");
		$("stale").hidden = true;
	};

	let before = answer()?.dataset.verdict, open = [], scrolled = 0;
	const remember = () => {
		open = [...document.querySelectorAll("#workspace details[open][id]")].map((d) => d.id);
		scrolled = $("answer").scrollTop;
	};
	const renewed = () => {
		isFresh();
		open.forEach((id) => $(id)?.setAttribute("open", ""));
		$("answer").scrollTop = scrolled;
		// Reasons are typed beside their fields: while one is, its box stays.
		if (!document.activeElement?.closest(".slot")) {
			document.querySelectorAll("#answer-now template[data-slot]").forEach((t) => {
				$(t.dataset.slot)?.replaceChildren(t.content.cloneNode(true));
			});
		}
		const now = answer().dataset;
		if (now.verdict !== before) $("announce").textContent = now.says;
		before = now.verdict;
	};

	// A button of the form is on its way with all that was typed, and its page brings
	// the answer: to ask for the answer alone meanwhile would cancel the button.
	let pressed = 0;
	document.addEventListener("htmx:config:request", (e) => {
		const action = e.detail.ctx.request.action;
		if (action === "/design") pressed++;
		if (action === "/design/answer" && pressed) e.preventDefault();
	});
	document.addEventListener("htmx:finally:request", (e) => {
		if (e.detail.ctx.request.action === "/design") pressed--;
	});

	const ofDesign = (e) => e.detail?.ctx?.request?.action?.startsWith("/design");
	document.addEventListener("htmx:before:swap", (e) => {
		if (!ofDesign(e)) return;
		const status = e.detail.ctx.response?.status;
		if (status >= 400 && status !== 422) {
			e.preventDefault(); // an error page is no answer
			isStale(`The answer could not be renewed (${status}). What stands below is from before your last change.`);
			return;
		}
		remember();
	});
	document.addEventListener("htmx:after:swap", (e) => {
		if (!ofDesign(e)) return;
		twins();
		renewed();
		if (e.detail.ctx.request.action === "/design") touched();
	});
	document.addEventListener("htmx:error", (e) => {
		if (ofDesign(e)) isStale("The service does not answer. What stands below is from before your last change; what you typed is kept in this browser.");
	});
	document.addEventListener("input", (e) => {
		if (!e.target.closest("#design")) return;
		clearTimeout(late);
		late = setTimeout(isStale, 600, "The answer is being renewed: what stands below is from before your last change.");
		touched();
		twins();
		planeNames();
	});

	// ---- Paper ----

	document.querySelectorAll("[data-print]").forEach((b) => {
		b.hidden = false;
		b.addEventListener("click", () => print());
	});

	// A folded part opens when something leads into it.
	const unfold = (hash) => {
		const at = hash.length > 1 && $(decodeURIComponent(hash.slice(1)));
		for (let d = at && at.closest("details"); d; d = d.parentElement.closest("details")) d.open = true;
		return at;
	};
	document.addEventListener("click", (e) => {
		const link = e.target.closest('a[href^="#"]');
		if (!link) return;
		const at = unfold(link.hash);
		if (at?.matches("input, select, textarea")) {
			e.preventDefault();
			at.focus();
			at.scrollIntoView({ block: "center" });
		}
	});

	begin();
})();
