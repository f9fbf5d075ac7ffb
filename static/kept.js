// What is typed into a design is kept: in this browser after a moment, and on the
// server, as a draft, after a pause of a second. The page works without; a button
// keeps the draft then.
(() => {
	"use strict";
	const $ = (id) => document.getElementById(id);
	const form = () => $("design");
	const origin = (name) => document.querySelector(`#origin [name="${name}"]`);

	// ---- In this browser ----

	const store = "rimeline.drafts"; // [{id, at, title, fields: {name: value}, kept}], latest first; kept: the server has it
	const keep = 5;
	const tab = "rimeline.tab"; // in sessionStorage: the copy that this tab writes
	const goesOn = "rimeline.goes-on"; // there too: the next page is about the same design

	const copies = () => {
		try { return JSON.parse(localStorage.getItem(store)) || []; } catch { return []; }
	};
	const save = (all) => {
		for (let n = Math.min(all.length, keep); n >= 0; n--) {
			try { return localStorage.setItem(store, JSON.stringify(all.slice(0, n))); } catch { /* no room: fewer */ }
		}
	};
	const own = () => copies().find((c) => c.id === sessionStorage.getItem(tab));
	const forget = (which) => save(copies().filter((c) => !which(c)));

	let changed = false, soon;
	const write = () => {
		if (!form() || !changed) return;
		changed = false;
		let id = sessionStorage.getItem(tab);
		if (!id) sessionStorage.setItem(tab, id = String(Date.now()));
		const fields = Object.fromEntries([...new FormData(form())].filter(([, value]) => typeof value === "string"));
		const title = (fields["/title"] || "").trim();
		save([{ id, at: Date.now(), title, fields, kept: false }, ...copies().filter((c) => c.id !== id)]);
	};
	// The copy now stands on the server too, under the draft that the page knows.
	const isKept = () => save(copies().map((c) => {
		if (c.id !== sessionStorage.getItem(tab)) return c;
		for (const name of ["draft", "draft-version"]) c.fields[name] = origin(name).value;
		return { ...c, kept: true };
	}));

	// ---- On the server ----

	const pause = 1000, longest = 5000; // ms: after the last key, and after the first one that is not kept
	const autosaves = $("origin")?.hasAttribute("data-autosave");
	let typed = 0; // when the first key was pressed that is not on its way; 0 for none
	let unanswered = null; // what was sent and not answered: sent again as it was, it is kept once
	let busy = null, timer, wait, leaving = false;

	const touched = () => {
		changed = true;
		clearTimeout(soon);
		soon = setTimeout(write, 300);
		if (!autosaves) return;
		typed ||= Date.now();
		clearTimeout(timer);
		timer = setTimeout(send, Math.min(pause, Math.max(0, typed + longest - Date.now())));
	};

	const body = () => {
		const all = new URLSearchParams(new FormData(form()));
		all.set("autosave", "yes");
		return all;
	};
	const post = (what) => fetch("/drafts", { method: "POST", body: what, keepalive: what.toString().length < 60000 });

	const say = (...nodes) => {
		const words = nodes.map((n) => n.textContent ?? n).join("");
		if ($("kept").dataset.says === words) return; // so that it is not read out again
		$("kept").dataset.says = words;
		$("kept").replaceChildren(...nodes);
		document.dispatchEvent(new Event("rimeline:times"));
	};
	const accept = (answer) => {
		const kept = answer.querySelector("[data-draft]");
		origin("draft").value = kept.dataset.draft;
		origin("draft-version").value = kept.dataset.version;
		if (!typed) isKept();
		$("kept").classList.remove("failed");
		say(...kept.children);
		wait = 0;
		$("away")?.remove();
		$("save").hidden = false;
		document.querySelectorAll(".whence[data-discards]").forEach((f) => {
			f.action = `/drafts/${kept.dataset.draft}/discard`;
			f.dataset.discards = kept.dataset.draft;
			f.elements.version.value = kept.dataset.version;
		});
		const here = "/drafts/" + kept.dataset.draft;
		if (location.pathname !== here) history.replaceState(history.state, "", here); // a reload then brings it back
	};
	const fail = (why) => {
		$("kept").classList.add("failed");
		say(`${why} What you typed is kept in this browser.`);
	};

	const once = async () => {
		if (!unanswered) {
			write();
			unanswered = body();
			typed = 0;
		}
		let response, answer;
		try {
			response = await post(unanswered);
			answer = new DOMParser().parseFromString(await response.text(), "text/html");
		} catch {
			fail("Not kept as a draft: the service does not answer.");
			return false;
		}
		if (response.ok) {
			unanswered = null;
			accept(answer);
			return true;
		}
		fail((answer.querySelector("main p") || answer.body).textContent.trim());
		if (response.status >= 500) return false;
		unanswered = null; // it will not be taken as it is
		return true;
	};
	const send = () => {
		clearTimeout(timer);
		if (!autosaves || busy || leaving || !form() || !(typed || unanswered)) return busy;
		busy = once().then((answered) => {
			busy = null;
			if (!answered) {
				wait = Math.min((wait || 1500) * 2, 30000);
				timer = setTimeout(send, wait);
			} else if (typed) {
				timer = setTimeout(send, pause);
			}
		});
		return busy;
	};
	addEventListener("online", send);

	// A page that may not come back leaves nothing behind that is not sent.
	addEventListener("visibilitychange", () => {
		if (document.visibilityState !== "hidden") return;
		write();
		send();
	});
	addEventListener("pagehide", () => {
		write();
		if (!autosaves || leaving || !typed || !form()) return;
		if (!busy && !unanswered) return send();
		const last = body();
		if (busy) last.set("draft-version", Number(last.get("draft-version")) + 1); // what is on its way makes the next one
		post(last).catch(() => {});
	});
	addEventListener("pageshow", () => { leaving = false; });

	// ---- From one page to the next ----

	document.addEventListener("submit", (e) => {
		const draft = e.target.dataset.discards;
		if (draft) {
			leaving = true;
			forget((c) => c.fields.draft === draft);
			return;
		}
		if (!["design", "carried"].includes(e.target.id) || e.submitter?.formAction.endsWith("/design/file")) return;
		write();
		clearTimeout(timer);
		sessionStorage.setItem(goesOn, "yes");
		if (busy) { // the next request must know the version that this one makes
			e.preventDefault();
			const submitter = e.submitter;
			const go = () => { busy = null; e.target.requestSubmit(submitter); };
			Promise.race([busy, new Promise((done) => setTimeout(done, 2000))]).then(go);
			return;
		}
		leaving = true;
	});

	const restore = async (copy) => {
		sessionStorage.setItem(tab, copy.id);
		await htmx.ajax("POST", "/design", { values: { ...copy.fields, do: "show" }, target: "#workspace", select: "#workspace", swap: "outerHTML" });
		for (const name of ["design", "base", "draft", "draft-version", "request"]) {
			if (copy.fields[name] !== undefined) origin(name).value = copy.fields[name];
		}
		if (!copy.kept) touched();
	};

	const two = (n) => String(n).padStart(2, "0");
	const time = (at) => {
		const then = new Date(at), clock = `at ${two(then.getHours())}:${two(then.getMinutes())}`;
		if (then.toDateString() === new Date().toDateString()) return clock;
		return `on ${then.getFullYear()}-${two(then.getMonth() + 1)}-${two(then.getDate())} ${clock}`;
	};
	// How many fields of the form a copy has another text for.
	const differing = (copy) => {
		const now = new FormData(form());
		const names = new Set([...now.keys(), ...Object.keys(copy.fields)].filter((name) => name.startsWith("/")));
		return [...names].filter((name) => (now.get(name) || "") !== (copy.fields[name] || "")).length;
	};
	const named = (c) => (c.title ? `“${c.title}”` : "a design without a title");
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

	// A reload brings back what this tab had; a fresh form offers what was typed before,
	// and the page of a design what is in this browser alone.
	const begin = () => {
		const gone = sessionStorage.getItem(goesOn);
		sessionStorage.removeItem(goesOn);
		if (!form()) return;
		if (autosaves && $("keep-draft")) $("keep-draft").hidden = true;
		const fresh = form().hasAttribute("data-fresh");
		const again = ["reload", "back_forward"].includes(performance.getEntriesByType("navigation")[0]?.type);
		const continued = gone && !fresh;
		const arrived = $("origin").dataset;
		if (continued && arrived.done === "saved") {
			forget((c) => c.id === sessionStorage.getItem(tab));
			sessionStorage.removeItem(tab);
			return;
		}
		const mine = own();
		if (mine && continued) {
			if (arrived.done === "kept") isKept();
			else if (!mine.kept) touched();
			return;
		}
		const here = mine && mine.kept && mine.fields.draft === origin("draft").value; // the server has filled the form with it
		if (mine && again && !here) {
			restore(mine).then(() => offer([`Restored: what you typed here ${time(mine.at)}. `, button("Start an empty design", () => {
				sessionStorage.removeItem(tab);
				location.assign("/design");
			})]));
			return;
		}
		if (mine && again) return;
		sessionStorage.removeItem(tab);
		const design = origin("design").value, draft = origin("draft").value;
		const past = copies().filter((c) => differing(c) && (fresh || !c.kept && (design ? c.fields.design === design : c.fields.draft === draft))).slice(0, 3);
		if (!past.length) return;
		const forgets = button(past.length > 1 ? "Forget these" : "Forget it", () => { forget((c) => past.some((p) => p.id === c.id)); offer(); });
		const rows = past.map((c) => {
			const n = differing(c);
			const what = fresh ? `You typed ${named(c)} here ${time(c.at)}. ` : `In this browser alone is what you typed ${time(c.at)}; ${n} ${n > 1 ? "fields differ" : "field differs"}. `;
			return [what, button("Restore it", () => restore(c).then(() => offer()))];
		});
		if (rows.length === 1) rows[0].push(" ", forgets); else rows.push([forgets]);
		offer(...rows);
	};

	document.addEventListener("input", (e) => e.target.closest("#design") && touched());
	document.addEventListener("htmx:after:swap", (e) => e.detail?.ctx?.request?.action === "/design" && touched());

	begin();
})();
