// Comfort for the pages of Rimeline; every page works without it. htmx renews the
// answer while one types; this file tells times of day as the reader's clock does,
// shows temperatures in the other unit, says a change of the verdict once, and never
// lets an old answer pass for a new one. What is typed is kept by kept.js.
(() => {
	"use strict";
	const $ = (id) => document.getElementById(id);

	// ---- Times of day, which the server gives in UTC ----

	const two = (n) => String(n).padStart(2, "0");
	const local = (at) => {
		const t = new Date(at), clock = `${two(t.getHours())}:${two(t.getMinutes())}`;
		if (t.toDateString() === new Date().toDateString()) return clock;
		return `${t.getFullYear()}-${two(t.getMonth() + 1)}-${two(t.getDate())} ${clock}`;
	};
	const times = () => {
		document.querySelectorAll("time[data-clock]").forEach((t) => { t.textContent = local(t.dateTime); });
		document.querySelectorAll("time[data-clock-title]").forEach((t) => { t.title = local(t.dateTime); });
	};
	document.addEventListener("rimeline:times", times);
	times();

	// What a page says of what was just done is not said again after a reload.
	if (document.querySelector(".said") && location.search) {
		const query = new URLSearchParams(location.search);
		["saved", "kept", "done", "of"].forEach((name) => query.delete(name));
		history.replaceState(history.state, "", location.pathname + (query.size ? "?" + query : ""));
	}

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
	});
	document.addEventListener("htmx:error", (e) => {
		if (ofDesign(e)) isStale("The service does not answer. What stands below is from before your last change; what you typed is kept in this browser.");
	});
	document.addEventListener("input", (e) => {
		twins();
		if (!e.target.closest("#design")) return;
		clearTimeout(late);
		late = setTimeout(isStale, 600, "The answer is being renewed: what stands below is from before your last change.");
		planeNames();
	});

	// ---- Lists: a row opens what it is about ----

	document.addEventListener("click", (e) => {
		const row = e.target.closest(".entries tbody tr");
		if (!row || e.target.closest("a, button, input, label") || getSelection().toString()) return;
		row.querySelector(".opens")?.click();
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
})();
