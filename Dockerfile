# The workbench for a team: one container, designs kept in a volume.
#   docker build -t loopwright .
#   docker run -p 8478:8478 -v loopwright-designs:/data -e LOOPWRIGHT_HOSTS=loops.example loopwright
FROM python:3-slim

# Nothing is written beside the code at run time, and log lines appear at once.
ENV PYTHONDONTWRITEBYTECODE=1 PYTHONUNBUFFERED=1 PIP_NO_CACHE_DIR=1 PIP_DISABLE_PIP_VERSION_CHECK=1

WORKDIR /app
COPY pyproject.toml README.md LICENSE ./
COPY engine engine
COPY server server
COPY web web
COPY demo_plants demo_plants
RUN pip install . && rm -rf /app/* \
    && useradd --system --uid 10001 --home-dir /data --shell /usr/sbin/nologin loopwright \
    && mkdir /data && chown loopwright /data

ENV LOOPWRIGHT_HOST=0.0.0.0 LOOPWRIGHT_PORT=8478 LOOPWRIGHT_STORE=/data/links.sqlite
USER loopwright
WORKDIR /data
VOLUME /data
EXPOSE 8478
HEALTHCHECK --interval=30s --timeout=5s --start-period=20s CMD ["python", "-c", \
    "import os, urllib.request as u; u.urlopen('http://127.0.0.1:' + os.environ['LOOPWRIGHT_PORT'] + '/healthz', timeout=4)"]
CMD ["loopwright", "serve", "--no-browser"]
