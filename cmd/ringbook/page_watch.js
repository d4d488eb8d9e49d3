// Takes the page anew whenever the server says that there is another one.
"use strict";
let shown = document.querySelector("main").dataset.version;
let taken = Promise.resolve(); // one after the other

async function take() {
  const answer = await fetch("/", { cache: "no-store" });
  if (!answer.ok) throw new Error(answer.statusText);
  const next = new DOMParser().parseFromString(await answer.text(), "text/html");
  const main = next.querySelector("main");
  const open = [...document.querySelectorAll("details")].map((d) => d.open);
  next.querySelectorAll("details").forEach((d, i) => { d.open = open[i] === true; });
  document.querySelector("main").replaceWith(main);
  document.title = next.title;
  shown = main.dataset.version;
}

// What is old must not pass for what is.
function lost(yes) {
  document.querySelector("#lost")?.remove();
  if (!yes) return;
  const p = document.createElement("p");
  p.id = "lost";
  p.className = "error";
  p.setAttribute("role", "alert");
  p.textContent = "The program that serves this page does not answer: trials logged since are not on it.";
  document.querySelector("h1").after(p);
}

function listen() {
  const events = new EventSource("/events");
  events.onmessage = (e) => {
    lost(false);
    taken = taken.then(() => e.data !== shown && take()).catch(() => lost(true));
  };
  events.onerror = () => {
    lost(true);
    if (events.readyState === EventSource.CLOSED) setTimeout(listen, 5000);
  };
}

listen();
